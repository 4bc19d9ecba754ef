"""Rows that keep some path open: one unit of flow has to find its way."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from planner.diagram import DOWN, UP, Diagram, Nodes
from planner.program.colliders import collider_literals
from planner.program.model import Literal, Program, negation

__all__ = ["connected"]

State = tuple[int, int]
"""A node and how the flow came to it: ``UP`` from a child or ``DOWN`` from a parent."""


@dataclass(frozen=True, slots=True)
class Arc:
    """A step from one state to the next, and what must hold for it."""

    tail: State
    head: State
    allowed: Literal


def connected(
    program: Program,
    name: str,
    diagram: Diagram,
    start: int,
    ends: Mapping[int, Literal],
    given: Mapping[int, Literal],
    opens: Literal,
) -> None:
    """Ensure that a path from the start to some chosen end is open.

        Σ flow out of the start = opens
        flow into a state = flow out of it + flow that ends there
        flow along a node as no collider ≤ 1 − s_v        flow out of a collider ≤ o_v
        flow that ends at a node ≤ end_v                  o_v ≤ s_v + Σ over children of o_c

    A separation can do with marks that are too many; that something *is* open needs a witness, so
    the inequalities turn round.

    Parameters
    ----------
    start
        Never conditioned on.
    ends, given
        Whether each node is an end, or conditioned on; a node that is not there is neither.
    opens
        A path is asked for only where this is true.
    """
    relevant = diagram.ancestors({start, *ends, *given})
    opened, undecided = collider_literals(program, name, diagram, relevant, given)
    for v in undecided:
        # o_v ≤ s_v + Σ o_c; exact, as a diagram has no circle.
        children = [opened[child] for child in diagram.children[v] if child in relevant]
        row = f"{name}: opened by[{v}]"
        program.clause(row, negation(opened[v]), given.get(v, False), *children)
    arcs = list(arcs_among(diagram, relevant - {start}, given, opened))
    arcs += [Arc((start, UP), (p, UP), allowed=True) for p in diagram.parents[start]]
    arcs += [
        Arc((start, UP), (c, DOWN), allowed=True) for c in diagram.children[start] if c in relevant
    ]
    out_of: dict[State, list[Literal]] = {}
    into: dict[State, list[Literal]] = {}
    for arc in arcs:
        flow = program.literal(f"{name}: flow[{arc.tail}→{arc.head}]")
        program.clause(f"{name}: allowed[{arc.tail}→{arc.head}]", negation(flow), arc.allowed)
        out_of.setdefault(arc.tail, []).append(flow)
        into.setdefault(arc.head, []).append(flow)
    for node, way in into:
        if node in ends:
            stops = program.literal(f"{name}: stops[{node}, {way}]")
            program.clause(f"{name}: stops at an end[{node}]", negation(stops), ends[node])
            out_of.setdefault((node, way), []).append(stops)
    program.equal(f"{name}: sets out", ones(out_of.pop((start, UP), [])), ones([opens]))
    for state in {**into, **out_of}:
        flows_in, flows_out = into.get(state, []), out_of.get(state, [])
        program.equal(f"{name}: goes on[{state}]", ones(flows_in), ones(flows_out))


def ones(literals: list[Literal]) -> list[tuple[int, Literal]]:
    """Return the literals, each counted once."""
    return [(1, literal) for literal in literals]


def arcs_among(
    diagram: Diagram, nodes: Nodes, given: Mapping[int, Literal], opened: Mapping[int, Literal]
) -> Iterator[Arc]:
    """Return the steps that a path may take out of these nodes, to others of them."""
    for node in sorted(nodes):
        free = negation(given.get(node, False))
        for child in diagram.children[node]:
            if child in nodes:
                yield Arc((node, UP), (child, DOWN), free)
                yield Arc((node, DOWN), (child, DOWN), free)
        for parent in diagram.parents[node]:
            if parent in nodes:
                yield Arc((node, UP), (parent, UP), free)
                yield Arc((node, DOWN), (parent, UP), opened[node])

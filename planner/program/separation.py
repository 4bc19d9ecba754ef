"""Rows that close every path, in a diagram in which arrows may be taken out by choice.

What is conditioned on is itself chosen, so which colliders are open is not known beforehand. The
rows follow a walk that marks every state (node, way of arrival) that an open path can reach;
marking too much is never wrong, for it only forbids more.
"""

from collections.abc import Collection, Mapping
from dataclasses import dataclass, field

from planner.diagram import Diagram
from planner.program.colliders import collider_literals
from planner.program.model import Literal, Program, negation

__all__ = ["separated"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Walk:
    """The marks of one walk: where an open path can get to."""

    program: Program
    name: str
    up: Mapping[int, Literal]
    """Come up into the node from one of its children."""
    down: Mapping[int, Literal]
    """Come down into the node from one of its parents."""
    opened: Mapping[int, Literal]
    """The node is conditioned on, or has a descendant that is."""
    given: Mapping[int, Literal]
    removed: Mapping[int, Literal] = field(default_factory=dict)
    """The arrows out of the node are taken out."""

    def pass_through(self, diagram: Diagram, node: int) -> None:
        """Carry the marks of a node on to its neighbours.

        up_p   ≥ up_v − s_v − M_p                down_c ≥ up_v − s_v − M_v
        up_p   ≥ down_v + o_v − 1 − M_p          down_c ≥ down_v − s_v − M_v
        """
        s, o = self.given.get(node, False), self.opened[node]
        up, down = negation(self.up[node]), negation(self.down[node])
        for parent in self._near(diagram.parents[node]):
            out = self.removed.get(parent, False)
            row = f"{self.name}[{node}↑{parent}]"
            self.program.clause(row, up, s, out, self.up[parent])
            self.program.clause(row, down, negation(o), out, self.up[parent])
        out = self.removed.get(node, False)
        for child in self._near(diagram.children[node]):
            row = f"{self.name}[{node}↓{child}]"
            self.program.clause(row, up, s, out, self.down[child])
            self.program.clause(row, down, s, out, self.down[child])

    def set_out(self, diagram: Diagram, start: int) -> None:
        """Mark the neighbours of the start."""
        for parent in self._near(diagram.parents[start]):
            out = self.removed.get(parent, False)
            self.program.clause(f"{self.name}[start↑{parent}]", out, self.up[parent])
        for child in self._near(diagram.children[start]):
            self.program.clause(f"{self.name}[start↓{child}]", self.down[child])

    def stop_at(self, ends: Mapping[int, Literal]) -> None:
        """Let no mark come to an end that is chosen: mark + chosen ≤ 1."""
        for node, chosen in ends.items():
            for mark in (self.up.get(node, False), self.down.get(node, False)):
                self.program.clause(f"{self.name}[end {node}]", negation(mark), negation(chosen))

    def _near(self, nodes: Collection[int]) -> list[int]:
        return [node for node in nodes if node in self.up]


def separated(
    program: Program,
    name: str,
    diagram: Diagram,
    start: int,
    ends: Mapping[int, Literal],
    given: Mapping[int, Literal],
    removed: Mapping[int, Literal] | None = None,
) -> None:
    """Ensure that no path from the start to a chosen end is open.

    Parameters
    ----------
    start
        Never conditioned on, and its own arrows never taken out.
    ends
        Whether each node is an end; a node that is not there is none.
    given
        Whether each node is conditioned on; a node that is not there never is.
    removed
        Whether the arrows out of each node are taken out.

    Notes
    -----
    Only ancestors of the start, of possible ends and of what may be conditioned on can lie on an
    open path. A collider is open where it is conditioned on or has a descendant that is (Pearl
    1988). The rows count descendants along removed arrows too; no criterion here conditions on a
    descendant of a node whose arrows it may take out, so that nothing is counted wrongly.
    """
    relevant = diagram.ancestors({start, *ends, *given})
    opened, undecided = collider_literals(program, name, diagram, relevant, given)
    for v in undecided:
        # o_v ≥ s_v, and o_v ≥ o_c for each child c.
        row = f"{name}: opened by[{v}]"
        program.clause(row, negation(given.get(v, False)), opened[v])
        for child in diagram.children[v]:
            if child in relevant:
                program.clause(row, negation(opened[child]), opened[v])
    walk = Walk(
        program=program,
        name=name,
        up={v: program.literal(f"{name}: up[{v}]") for v in relevant if v != start},
        down={v: program.literal(f"{name}: down[{v}]") for v in relevant if v != start},
        opened=opened,
        given=given,
        removed=removed or {},
    )
    walk.set_out(diagram, start)
    for node in sorted(relevant - {start}):
        walk.pass_through(diagram, node)
    walk.stop_at(ends)

"""Rows that cut every path along given arcs."""

from collections.abc import Collection, Mapping

from planner.program.model import Literal, Program, negation

__all__ = ["cut"]


def cut(
    program: Program,
    name: str,
    arcs: Collection[tuple[int, int]],
    source: int,
    sink: int,
    chosen: Mapping[int, Literal],
    opens: Literal,
) -> None:
    """Ensure that every path from source to sink passes a chosen node.

        reached_source = 1
        reached_b ≥ reached_a − chosen_a     for each arc a → b, chosen_source = 0
        reached_sink = 0

    Parameters
    ----------
    arcs
        An edge that can be gone both ways stands here twice.
    chosen
        A node that is not there is never chosen.
    opens
        The rows bind only where this is true.
    """
    reached: dict[int, Literal] = {source: True, sink: negation(opens)}
    for a, b in arcs:
        for node in (a, b):
            if node not in reached:
                reached[node] = program.literal(f"{name}: reached[{node}]")
    for a, b in arcs:
        passed = False if a == source else chosen.get(a, False)
        program.clause(f"{name}[{a}→{b}]", negation(reached[a]), passed, reached[b])

"""Literals that say which colliders are open."""

from collections.abc import Mapping

from planner.diagram import Diagram, Nodes
from planner.program.model import Literal, Program

__all__ = ["collider_literals"]


def collider_literals(
    program: Program, name: str, diagram: Diagram, relevant: Nodes, given: Mapping[int, Literal]
) -> tuple[dict[int, Literal], list[int]]:
    """Return o_v, whether v is conditioned on or has a descendant that is, and who is undecided.

    A node above something that is surely conditioned on is open; a node above nothing that may be
    is not. Only the others get a variable, and rows that bind it from the side that matters.
    """
    surely = diagram.ancestors(node for node, literal in given.items() if literal is True)
    perhaps = diagram.ancestors(given)
    undecided = sorted((relevant & perhaps) - surely)
    opened: dict[int, Literal] = {node: node in surely for node in sorted(relevant)}
    opened |= {node: program.literal(f"{name}: opened[{node}]") for node in undecided}
    return opened, undecided

"""Reasons that every route shares, found by looking at the diagram, as data.

Each function answers with a ``Finding``: a kind, a path that shows it, and the nodes that take
part. The words come later.
"""

from collections.abc import Iterable

from planner.claims import Claim, Roles, Separation
from planner.diagram import Nodes, Path
from planner.findings import Finding

__all__ = ["after_treatment", "opened_by", "shielded", "through"]


def through(claim: Claim, node: int) -> Path:
    """Return a directed path from the treatment to the outcome through a node between them."""
    before = claim.diagram.directed_path(claim.treatment, {node})
    behind = claim.diagram.directed_path(node, {claim.outcome})
    assert before and behind, "the node lies on a directed path"  # noqa: PT018
    return before + behind[1:]


def after_treatment(claim: Claim, node: int) -> Finding:
    """Say where a descendant of the treatment lies: on the causal path, below it or aside."""
    if node in claim.causal and node != claim.outcome:
        return Finding("on_causal_path", through(claim, node), (node,))
    if node in claim.forbidden:
        return Finding("below_causal_path", _below(claim, node), (node,))
    path = claim.diagram.directed_path(claim.treatment, {node})
    assert path, "the node follows from the treatment"
    return Finding("after_treatment", path, (node,))


def _below(claim: Claim, node: int) -> Path:
    """Return a directed path from the treatment over a causal node to a node below it."""
    ways = [(start, claim.diagram.directed_path(start, {node})) for start in sorted(claim.causal)]
    start, behind = min(
        ((start, path) for start, path in ways if path), key=lambda each: len(each[1])
    )
    before = claim.diagram.directed_path(claim.treatment, {start})
    assert before, "a causal node follows from the treatment"
    return before + behind[1:]


def opened_by(separations: Iterable[Separation], node: int) -> Finding | None:
    """Say which path conditioning on one node more would open, if any."""
    for separation in separations:
        if path := separation.breach_with(node):
            return Finding("opens", path, (node,))
    return None


def shielded(separations: Iterable[Separation], roles: Roles, node: int) -> Finding:
    """Say why a node that is not held cannot bias anything.

    If the two ends of a separation are both joined to a node by open paths, the node must be a
    collider between them, and holding it would open a path (``opened_by`` comes first). So every
    other node is cut off from one end: by itself (``unlinked``), or by what the plan holds
    (``shielded``: an open path of the node, were nothing held, and who closes it).
    """
    found = [_shielded(separation, roles, node) for separation in separations]
    return next((each for each in found if each.kind == "shielded"), found[0])


def _shielded(separation: Separation, roles: Roles, node: int) -> Finding:
    diagram, given = separation.diagram, separation.given
    closed = [side for side in separation.sides() if diagram.are_separated({node}, side, given)]
    assert closed, "a node joined to both ends is a collider, which opened_by finds"
    without_plan = given - roles.covariates
    paths = [(side, diagram.open_path({node}, side, without_plan)) for side in closed]
    for side, path in paths:
        if path is None:
            return Finding("unlinked", (), (node, *sorted(side)))
    _, path = paths[0]
    assert path, "the other sides have been returned"
    return Finding("shielded", path, (node, _closer(separation, path, roles.covariates)))


def _closer(separation: Separation, path: Path, covariates: Nodes) -> int:
    """Return the first covariate on a path that the covariates close, and that is open without."""
    colliders = separation.diagram.colliders(path)
    return next(node for node in path[1:-1] if node in covariates and node not in colliders)

"""Why an instrument needs each variable, does not need the others, or cannot be had."""

from collections.abc import Iterable
from dataclasses import replace

from planner.claims import Claim, Roles
from planner.diagram import Nodes
from planner.findings import Finding
from planner.reasons import after_treatment, opened_by, shielded
from planner.routes.instrument.criterion import breaches, link, nearest, separations

__all__ = ["hindrances", "left_out", "needed", "opened"]

CLOSEST_FIRST = ("link_cut", "reaches_outcome", "no_link", "comes_after")
"""How a candidate can fail, the nearest miss first."""


def opened(claim: Claim, roles: Roles) -> Finding:
    """Say what opens the route: the link of the instrument to the treatment."""
    path = link(claim, roles).breach()
    assert path, "the instrument is linked to the treatment"
    return Finding("instrument_found", path, tuple(sorted(roles.instruments)))


def needed(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say which path would be open, or which link lost, without a variable."""
    linked = link(claim, roles).breach()
    assert linked, "the instrument is linked to the treatment"
    if node in roles.instruments:
        return Finding("moves", linked, (node,))
    breach = next(breaches(claim, roles.without(node)))
    if breach.kind == "no_link":
        return Finding("keeps_link", linked, (node,))
    return Finding("closes", breach.path, (node,))


def left_out(claim: Claim, roles: Roles, nodes: Iterable[int]) -> dict[int, Finding]:
    """Say why each variable is not held: it must not be, or nothing would be gained."""
    established = separations(claim, roles)
    return {
        node: after_treatment(claim, node)
        if node in claim.after
        else opened_by(established, node)
        or undoing(claim, roles, node)
        or shielded(established, roles, node)
        for node in nodes
    }


def undoing(claim: Claim, roles: Roles, node: int) -> Finding | None:
    """Say which link of the instrument holding one node more would cut, if it would cut all."""
    if link(claim, roles.adjusting(node)).breach() is not None:
        return None
    path = link(claim, roles).breach()
    assert path, "the instrument is linked to the treatment"
    return Finding("cuts_link", path, (node,))


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return the nearest miss, then for each candidate the first condition that it fails.

    Conditions in order: it comes before the treatment; it is linked to it; some covariates close
    its paths to the outcome (if any do, so do the nearest ones); the link outlasts those.
    """
    others = measurable - claim.ends - claim.selected
    if not others:
        return (Finding("no_candidate"),)
    found = [hindrance(claim, measurable, node) for node in claim.diagram.by_name(others)]
    closest = min(found, key=lambda each: CLOSEST_FIRST.index(each.kind))
    return (Finding("no_instrument", closest.path, closest.nodes[:1]), *found)


def hindrance(claim: Claim, measurable: Nodes, node: int) -> Finding:
    """Return the first condition that one candidate fails, when no instrument can be had."""
    if node in claim.after:
        path = claim.diagram.directed_path(claim.treatment, {node})
        assert path, "the node follows from the treatment"
        return Finding("comes_after", path, (node,))
    alone = Roles(instruments=frozenset((node,)))
    linked = link(claim, alone).breach()
    if linked is None:
        return Finding("no_link", (), (node,))
    covariates = nearest(claim, claim.before(measurable), node)
    (exclusion,) = separations(claim, replace(alone, covariates=covariates))
    if path := exclusion.breach():
        return Finding("reaches_outcome", path, (node, *exclusion.diagram.colliders(path)))
    return Finding("link_cut", linked, (node, *claim.diagram.by_name(covariates)))

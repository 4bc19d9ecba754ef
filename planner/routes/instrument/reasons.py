"""Why an instrument needs each variable, does not need the others, or cannot be had."""

from planner.claims import Claim, Finding, Roles
from planner.diagram import Nodes
from planner.reasons import after_treatment, opened_by, shielded
from planner.routes.instrument.criterion import breaches, candidates, link, separations

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


def left_out(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say why a variable is not held: it must not be, or nothing would be gained."""
    if node in claim.after:
        return after_treatment(claim, node)
    established = separations(claim, roles)
    if opens := opened_by(established, node):
        return opens
    if link(claim, roles.holding(node)).breach() is None:
        path = link(claim, roles).breach()
        assert path, "the instrument is linked to the treatment"
        return Finding("cuts_link", path, (node,))
    return shielded(established, roles, node)


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return the nearest miss, then for each candidate the first condition that it fails.

    Conditions in order: it comes before the treatment; some covariates close its paths to the
    outcome (if any do, so do all that can be measured among the ancestors of the two); it is linked
    to the treatment at all; the link survives those covariates.
    """
    people = measurable - claim.ends - claim.selected
    if not people:
        return (Finding("no_candidate"),)
    found = [hindrance(claim, measurable, node) for node in claim.diagram.by_name(people)]
    closest = min(found, key=lambda each: CLOSEST_FIRST.index(each.kind))
    return (Finding("no_instrument", closest.path, closest.nodes), *found)


def hindrance(claim: Claim, measurable: Nodes, node: int) -> Finding:
    """Return the first condition that one candidate fails, when no instrument can be had."""
    if node in claim.after:
        path = claim.diagram.directed_path(claim.treatment, {node})
        assert path, "the node follows from the treatment"
        return Finding("comes_after", path, (node,))
    ancestors = claim.noncausal.ancestors({node, claim.outcome} | claim.selected)
    held = (candidates(claim, measurable).covariates & ancestors) - {node}
    roles = Roles(instruments=frozenset((node,)), covariates=held)
    (exclusion,) = separations(claim, roles)
    if path := exclusion.breach():
        return Finding("reaches_outcome", path, (node,))
    if path := link(claim, Roles(instruments=roles.instruments)).breach():
        return Finding("link_cut", path, (node,))
    return Finding("no_link", (), (node,))

"""Why conditioning needs each variable, does not need the others, or cannot be taken."""

from collections.abc import Iterable

from planner.claims import Claim, Roles
from planner.diagram import Nodes
from planner.findings import Finding
from planner.reasons import after_treatment, opened_by, shielded
from planner.routes.conditioning.criterion import breaches, candidates, separations

__all__ = ["hindrances", "left_out", "needed", "opened"]


def opened(claim: Claim, roles: Roles) -> Finding:
    """Say what opens the route."""
    return Finding("back_doors_closed", (), tuple(claim.diagram.by_name(roles.covariates)))


def needed(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say which back-door path would be open without a covariate."""
    breach = next(breaches(claim, roles.without(node)))
    return Finding("closes", breach.path, (node,))


def left_out(claim: Claim, roles: Roles, nodes: Iterable[int]) -> dict[int, Finding]:
    """Say why each variable is not held: it must not be, or nothing would be gained."""
    established = separations(claim, roles)
    return {
        node: after_treatment(claim, node)
        if node in claim.forbidden
        else opened_by(established, node) or shielded(established, roles, node)
        for node in nodes
    }


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return a back-door path that is open even with everything held that can be.

    Colliders on it are named: the path is open because of what is held, and another one would be
    if that were not.
    """
    (back_doors,) = separations(claim, candidates(claim, measurable))
    path = back_doors.breach()
    assert path, "a route without an opening has an open back door"
    return (Finding("back_door_open", path, back_doors.diagram.colliders(path)),)

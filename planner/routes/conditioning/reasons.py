"""Why conditioning needs each variable, does not need the others, or cannot be taken."""

from planner.claims import Claim, Finding, Roles
from planner.diagram import Nodes
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


def left_out(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say why a variable is not held: it must not be, or nothing would be gained."""
    if node in claim.forbidden:
        return after_treatment(claim, node)
    established = separations(claim, roles)
    return opened_by(established, node) or shielded(established, roles, node)


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return the back-door path that nobody can close.

    If any set will do, so will everything that can be measured among the candidates; a path that is
    open even then settles it.
    """
    everything = candidates(claim, measurable)
    (back_doors,) = separations(claim, everything)
    path = back_doors.breach()
    if path is None:
        return ()
    parents = claim.diagram.parents
    colliders = (
        node
        for before, node, behind in zip(path, path[1:], path[2:], strict=False)
        if before in parents[node] and behind in parents[node]
    )
    return (Finding("back_door_open", path, tuple(colliders)),)

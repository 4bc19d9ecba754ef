"""Why the mechanism needs each variable, does not need the others, or cannot be taken."""

from planner.claims import Claim, Finding, Roles
from planner.diagram import Nodes, Path
from planner.reasons import after_treatment, opened_by, shielded, through
from planner.routes.mechanism.criterion import breaches, candidates, separations

__all__ = ["hindrances", "left_out", "needed", "opened"]


def opened(claim: Claim, roles: Roles) -> Finding:
    """Say what opens the route: a directed path, and the mediators that carry the effect."""
    mediators = claim.diagram.by_name(roles.mediators)
    return Finding("mediated", through(claim, mediators[0]), tuple(mediators))


def needed(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say which directed path would run past the mediators, or which back door be open, without."""
    breach = next(breaches(claim, roles.without(node)))
    kind = "carries" if breach.kind == "unmediated" else "closes"
    return Finding(kind, breach.path, (node,))


def left_out(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say why a variable is not measured: it must not be held, or nothing would be gained."""
    if node in claim.causal and node != claim.outcome:
        path = through(claim, node)
        return Finding("carried", path, (node, *(each for each in path if each in roles.mediators)))
    if node in claim.after:
        return after_treatment(claim, node)
    established = separations(claim, roles)
    return opened_by(established, node) or shielded(established, roles, node)


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return a directed path that mediators cannot carry, and the back doors that see to it.

    With everything held that can be, mediators are given up one by one while a back door of theirs
    stays open; what is left is the largest set without one (a smaller set only puts arrows back).
    If it misses a directed path, that path is the first finding, and the back door of each
    measurable mediator on it follows.
    """
    able = candidates(claim, measurable)
    left, open_doors = able.mediators, dict[int, Finding]()
    while left:
        roles = Roles(mediators=left, covariates=able.covariates)
        doors = {node: back_door(claim, roles, node) for node in left}
        given_up = {
            node: Finding("mediator_back_door", path, (node,))
            for node, path in doors.items()
            if path
        }
        if not given_up:
            break
        open_doors |= given_up
        left -= given_up.keys()
    path = claim.diagram.directed_path(claim.treatment, {claim.outcome}, left)
    if path is None:
        return ()
    on_path = [node for node in path if node in open_doors]
    return (Finding("unmediated", path, tuple(on_path)), *(open_doors[node] for node in on_path))


def back_door(claim: Claim, roles: Roles, node: int) -> Path | None:
    """Return a shortest open path from a mediator to the treatment or the outcome."""
    before, behind = separations(claim, roles)
    paths = (
        before.diagram.open_path(before.starts, {node}, before.given),
        behind.diagram.open_path({node}, behind.ends, behind.given),
    )
    return min(filter(None, paths), key=len, default=None)

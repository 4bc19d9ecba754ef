"""Why the mechanism needs each variable, does not need the others, or cannot be taken."""

from collections.abc import Iterable

from planner.claims import Claim, Roles
from planner.diagram import Nodes
from planner.findings import Finding
from planner.reasons import after_treatment, opened_by, shielded, through
from planner.routes.mechanism.criterion import (
    back_door,
    breaches,
    candidates,
    separations,
    shrunk,
)

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


def left_out(claim: Claim, roles: Roles, nodes: Iterable[int]) -> dict[int, Finding]:
    """Say why each variable is not measured: it must not be held, or nothing would be gained."""
    established = separations(claim, roles)
    return {
        node: carried(claim, roles, node)
        if node in claim.causal
        else after_treatment(claim, node)
        if node in claim.after
        else opened_by(established, node) or shielded(established, roles, node)
        for node in nodes
    }


def carried(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say which mediators already carry a path through another one."""
    path = through(claim, node)
    return Finding("carried", path, (node, *(each for each in path if each in roles.mediators)))


def hindrances(claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
    """Return a directed path that mediators cannot carry, and the back doors that see to it.

    The path misses the largest set of mediators without an open back door; what could be measured
    on it has one, with everything held that can be, and it follows.
    """
    able = candidates(claim, measurable)
    left = shrunk(claim, able)
    path = claim.diagram.directed_path(claim.treatment, {claim.outcome}, left)
    assert path, "a route without an opening has an unmediated path"
    doors = [door(claim, able, left, node) for node in path if node in able.mediators]
    return (Finding("unmediated", path, tuple(each.nodes[0] for each in doors)), *doors)


def door(claim: Claim, able: Roles, left: Nodes, node: int) -> Finding:
    """Return the open back door of a mediator that was given up, and colliders on it."""
    path = back_door(claim, able, left | {node}, node)
    assert path, "a mediator is given up for an open back door"
    return Finding("mediator_back_door", path, (node, *claim.diagram.colliders(path)))

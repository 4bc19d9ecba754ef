"""When an instrument gives the effect, in a linear model or with a constant effect.

(z, W) is valid if, with S = ``selected_by``,

    (1)  ({z} ∪ W ∪ S) ∩ De(X) = ∅
    (2)  z ∉ W ∪ S
    (3)  z is not d-separated from X by W ∪ S in G
    (4)  z ⊥ Y | W ∪ S in G_nc.

(1) is stricter than the linear theory asks (mediators, the outcome and their descendants would be
enough): a child of the treatment is no instrument in the sense of anyone who plans a study, and
wherever it would serve, a conditioning set among the same variables serves too.

References
----------
Brito & Pearl (2002), Generalized instrumental variables, UAI, for direct effects. Henckel,
Buttenschön & Maathuis (2024), Graphical tools for selecting conditional instrumental sets,
Biometrika 111, for total effects (from memory).
"""

from collections.abc import Iterator

from planner.claims import Claim, Roles, Separation
from planner.diagram import Nodes
from planner.findings import Finding

__all__ = ["breaches", "candidates", "link", "nearest", "opening", "separations"]


def candidates(claim: Claim, measurable: Nodes) -> Roles:
    """Return who may be an instrument or one of its covariates: what is not after the treatment.

    Every non-descendant may be an instrument, and a covariate of another one; a cheapest plan has
    W ⊆ An({z, Y} ∪ S), which hangs on z and is left to the search.
    """
    before = claim.before(measurable)
    return Roles(covariates=before, instruments=before)


def separations(claim: Claim, roles: Roles) -> tuple[Separation, ...]:
    """Return what the covariates have to close: (4)."""
    return (
        Separation(
            diagram=claim.noncausal,
            starts=roles.instruments,
            ends=frozenset((claim.outcome,)),
            given=roles.covariates | claim.selected,
        ),
    )


def link(claim: Claim, roles: Roles) -> Separation:
    """Return what the covariates must leave open: (3)."""
    return Separation(
        diagram=claim.diagram,
        starts=roles.instruments,
        ends=frozenset((claim.treatment,)),
        given=roles.covariates | claim.selected,
    )


def breaches(claim: Claim, roles: Roles) -> Iterator[Finding]:
    """Return each condition that the roles fail, with the path that shows it."""
    if len(roles.instruments) != 1:
        yield Finding("no_instrument")
        return
    given = roles.covariates | claim.selected
    # (1)  ({z} ∪ W ∪ S) ∩ De(X) = ∅
    for node in sorted((roles.instruments | given) & claim.after):
        path = claim.diagram.directed_path(claim.treatment, {node}) or (node,)
        yield Finding("after_treatment", path, (node,))
    # (2)  z ∉ W ∪ S
    for node in sorted(roles.instruments & given):
        yield Finding("held", (node,), (node,))
    if (roles.instruments & (given | claim.after)) or given & claim.ends:
        return
    # (3)  z is not d-separated from X by W ∪ S in G
    if link(claim, roles).breach() is None:
        yield Finding("no_link")
    # (4)  z ⊥ Y | W ∪ S in G_nc
    (exclusion,) = separations(claim, roles)
    if open_path := exclusion.breach():
        yield Finding("reaches_outcome", open_path)


def opening(claim: Claim, measurable: Nodes) -> Roles | None:
    """Return roles that open the route: a candidate with its nearest covariates, if any will do."""
    before = claim.before(measurable)
    for node in claim.diagram.by_name(before):
        roles = Roles(instruments=frozenset((node,)), covariates=nearest(claim, before, node))
        if not any(breaches(claim, roles)):
            return roles
    return None


def nearest(claim: Claim, before: Nodes, node: int) -> Nodes:
    """Return the covariates nearest to the outcome on all ways to a candidate.

    In the moral graph of G_nc on An({z, Y} ∪ S), the covariates that a walk from Y meets first. If
    any covariates among the ancestors close all paths between z and Y, these do; and if the link to
    the treatment outlasts any that do, it outlasts these. Without an ancestral instrument there is
    none at all (van der Zander, Textor & Liśkiewicz 2015, Efficiently finding conditional
    instruments for causal inference, IJCAI; from memory, and compared with trying all sets).
    """
    graph = claim.noncausal
    ancestral = graph.ancestors({node, claim.outcome} | claim.selected)
    neighbours: dict[int, set[int]] = {each: set() for each in ancestral}
    for one, other in graph.moral_edges(sorted(ancestral)):
        neighbours[one].add(other)
        neighbours[other].add(one)
    usable = (before & ancestral) - {node}
    met, stack = {claim.outcome}, [claim.outcome]
    while stack:
        for each in neighbours[stack.pop()] - met - claim.selected:
            met.add(each)
            if each not in usable:
                stack.append(each)
    return frozenset(met & usable)

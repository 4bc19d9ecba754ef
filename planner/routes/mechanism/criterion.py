"""When the mechanism gives the effect: mediators that carry all of it (the front door).

(M, W) is valid if, with S = ``selected_by``,

    (1)  (W ∪ S) ∩ De(X) = ∅
    (2)  M ≠ ∅ cuts every directed path from X to Y
    (3)  X ⊥ M | W ∪ S in G_-X
    (4)  M ⊥ Y | W ∪ S ∪ {X} in G_-M, arrows out of all of M taken out at once.

Then P(y | do(x)) = Σ_w P(w) Σ_m P(m | x, w) Σ_x′ P(y | x′, m, w) P(x′ | w). Causes of a mediator
and the outcome that follow from the treatment go into M, never into W.

References
----------
Pearl (1995), Causal diagrams for empirical research, Biometrika 82, for W = ∅. Fulcher, Shpitser,
Marealle & Tchetgen Tchetgen (2020), Robust inference on population indirect causal effects, JRSS-B
82, for baseline covariates.
"""

from collections.abc import Iterator

from planner.claims import Claim, Roles, Separation
from planner.diagram import Nodes, Path
from planner.findings import Finding

__all__ = ["back_door", "breaches", "candidates", "opening", "separations", "shrunk"]


def candidates(claim: Claim, measurable: Nodes) -> Roles:
    """Return who may play a part in a cheapest plan: M ⊆ cn \\ {Y}, W ⊆ An({X, Y} ∪ S) \\ De(X).

    By the ancestral argument nothing else can make a valid pair cheaper.
    """
    ancestors = claim.diagram.ancestors(claim.ends | claim.selected)
    return Roles(
        covariates=claim.before(measurable) & ancestors,
        mediators=measurable & (claim.causal - {claim.outcome}) - claim.selected,
    )


def separations(claim: Claim, roles: Roles) -> tuple[Separation, ...]:
    """Return what the covariates have to close: (3) and (4)."""
    given = roles.covariates | claim.selected
    treatment = frozenset((claim.treatment,))
    return (
        Separation(
            diagram=claim.diagram.without_arrows_out_of(treatment),
            starts=treatment,
            ends=roles.mediators,
            given=given,
        ),
        Separation(
            diagram=claim.diagram.without_arrows_out_of(roles.mediators),
            starts=roles.mediators,
            ends=frozenset((claim.outcome,)),
            given=given | treatment,
        ),
    )


def breaches(claim: Claim, roles: Roles) -> Iterator[Finding]:
    """Return each condition that the roles fail, with the path that shows it."""
    given = roles.covariates | claim.selected
    # (1)  (W ∪ S) ∩ De(X) = ∅
    for node in sorted(given & claim.after):
        path = claim.diagram.directed_path(claim.treatment, {node}) or (node,)
        yield Finding("after_treatment", path, (node,))
    for node in sorted(roles.mediators & claim.ends):
        yield Finding("forbidden", (node,), (node,))
    # (2)  M ≠ ∅ cuts every directed path from X to Y
    past = claim.diagram.directed_path(claim.treatment, {claim.outcome}, roles.mediators)
    if past:
        yield Finding("unmediated", past)
    if not roles.mediators - claim.ends or given & (claim.after | roles.mediators):
        return
    # (3)  X ⊥ M | W ∪ S in G_-X,  and  (4)  M ⊥ Y | W ∪ S ∪ {X} in G_-M
    before, behind = separations(claim, roles)
    if open_path := before.breach():
        yield Finding("treatment_side_open", open_path)
    if open_path := behind.breach():
        yield Finding("outcome_side_open", open_path)


def opening(claim: Claim, measurable: Nodes) -> Roles | None:
    """Return roles that open the route: the mediators that nothing stands against, if they do."""
    able = candidates(claim, measurable)
    roles = Roles(covariates=able.covariates, mediators=shrunk(claim, able))
    return None if any(breaches(claim, roles)) else roles


def shrunk(claim: Claim, able: Roles) -> Nodes:
    """Return the largest set of mediators without an open back door, all covariates held.

    Mediators are given up while a back door of theirs stays open. A smaller set only puts arrows
    back, so that a door once open stays so, and what is left holds every set that will do (after
    Jeong, Tian & Bareinboim 2022, Finding and listing front-door adjustment sets, NeurIPS).
    """
    left = able.mediators
    while given_up := {node for node in left if back_door(claim, able, left, node)}:
        left -= given_up
    return left


def back_door(claim: Claim, able: Roles, mediators: Nodes, node: int) -> Path | None:
    """Return a shortest open path from a mediator to the treatment or the outcome, if any."""
    roles = Roles(covariates=able.covariates, mediators=mediators)
    before, behind = separations(claim, roles)
    paths = (
        before.diagram.open_path(before.starts, {node}, before.given),
        behind.diagram.open_path({node}, behind.ends, behind.given),
    )
    return min(filter(None, paths), key=len, default=None)

"""When conditioning on covariates gives the effect.

Z is valid if, with S = ``selected_by``,

    (1)  (Z ∪ S) ∩ forb = ∅
    (2)  Z ∪ S d-separates X and Y in G_nc.

It is sound and complete for the effect P(y | do(x)) = Σ_z P(y | x, z) P(z).

References
----------
Shpitser, VanderWeele & Robins (2010), On the validity of covariate adjustment for estimating causal
effects, UAI. van der Zander, Liśkiewicz & Textor (2019), Separators and adjustment sets in causal
graphs, Artificial Intelligence 270, for the form with G_nc. Both from memory.
"""

from collections.abc import Iterator

from planner.claims import Claim, Roles, Separation
from planner.diagram import Nodes
from planner.findings import Finding

__all__ = ["breaches", "candidates", "opening", "separations"]


def candidates(claim: Claim, measurable: Nodes) -> Roles:
    """Return who may be a covariate of a cheapest plan: Z ⊆ An({X, Y} ∪ S) \\ De(X).

    If Z separates X and Y, so does its part inside An({X, Y} ∪ S), which costs no more.
    """
    ancestors = claim.diagram.ancestors(claim.ends | claim.selected)
    return Roles(covariates=claim.before(measurable) & ancestors)


def separations(claim: Claim, roles: Roles) -> tuple[Separation, ...]:
    """Return what the covariates have to close: (2)."""
    return (
        Separation(
            diagram=claim.noncausal,
            starts=frozenset((claim.treatment,)),
            ends=frozenset((claim.outcome,)),
            given=roles.covariates | claim.selected,
        ),
    )


def breaches(claim: Claim, roles: Roles) -> Iterator[Finding]:
    """Return each condition that the roles fail, with the path that shows it."""
    # (1)  (Z ∪ S) ∩ forb = ∅
    for node in sorted((roles.covariates | claim.selected) & claim.forbidden):
        path = claim.diagram.directed_path(claim.treatment, {node}) or (node,)
        yield Finding("forbidden", path, (node,))
    # (2)  Z ∪ S d-separates X and Y in G_nc
    (back_doors,) = separations(claim, roles)
    if not back_doors.given & claim.ends and (open_path := back_doors.breach()):
        yield Finding("back_door_open", open_path)


def opening(claim: Claim, measurable: Nodes) -> Roles | None:
    """Return roles that open the route: all candidates do, if any set does."""
    everything = candidates(claim, measurable)
    return None if any(breaches(claim, everything)) else everything

"""The instrument as rows of the integer program.

    z, W among what is not after the treatment, as variables                               (I1)
    Σ_v z_v = opens                                                                        (I2)
    z_v + W_v ≤ 1                                                                          (I3)
    z ⊥ Y | W ∪ S in G_nc                                                                  (I4)
    z is not d-separated from X by W ∪ S in G                                              (I5)

The marks of (I4) start at the outcome, so that the instrument can stay open, and one program does
for all candidates. (I5) is a constraint and no afterthought: the cheapest covariates that close all
paths between an instrument and the outcome often cut its link to the treatment too.
"""

from planner.claims import Claim
from planner.diagram import Nodes
from planner.program import Literal, Program, RoleLiterals, connected, negation, separated
from planner.routes.instrument.criterion import candidates

__all__ = ["write_rows"]


def write_rows(program: Program, claim: Claim, measurable: Nodes, opens: Literal) -> RoleLiterals:
    """Write (I1) to (I5)."""
    diagram = claim.diagram
    # (I1)
    people = diagram.by_name(candidates(claim, measurable).instruments)
    named = list(zip(people, diagram.named(people), strict=True))
    instruments = program.roles("instrument", named, opens)
    covariates = program.roles("instrument's covariate", named, opens)
    # (I2)
    program.equal("one instrument", [(1, z) for z in instruments.values()], [(1, opens)])
    # (I3)
    for node, name in named:
        program.clause(f"one role[{name}]", negation(instruments[node]), negation(covariates[node]))
    held: dict[int, Literal] = {**covariates, **dict.fromkeys(sorted(claim.selected), True)}
    # (I4)
    separated(program, "exclusion", claim.noncausal, claim.outcome, instruments, held)
    # (I5)
    connected(program, "link", diagram, claim.treatment, instruments, held, opens)
    return {"instruments": instruments, "covariates": covariates}

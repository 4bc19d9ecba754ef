"""The mechanism as rows of the integer program.

    M ⊆ cn \\ {Y},  W ⊆ An({X, Y} ∪ S) \\ De(X), as variables                             (M1)
    M cuts every directed path from X to Y                                                 (M2)
    X ⊥ M | W ∪ S in G_-X                                                                  (M3)
    M ⊥ Y | W ∪ S ∪ {X} in G_-M                                                            (M4)

The marks of (M3) start at the treatment and those of (M4) at the outcome; in (M4) an arrow can be
walked along only where its tail is no mediator.
"""

from planner.claims import Claim
from planner.diagram import Nodes
from planner.program import Literal, Program, RoleLiterals, cut, separated
from planner.routes.mechanism.criterion import candidates

__all__ = ["write_rows"]


def write_rows(program: Program, claim: Claim, measurable: Nodes, opens: Literal) -> RoleLiterals:
    """Write (M1) to (M4)."""
    diagram, x, y = claim.diagram, claim.treatment, claim.outcome
    # (M1)
    able = candidates(claim, measurable)
    many, others = diagram.by_name(able.mediators), diagram.by_name(able.covariates)
    mediators = program.roles("mediator", zip(many, diagram.named(many), strict=True), opens)
    covariates = program.roles(
        "mechanism's covariate", zip(others, diagram.named(others), strict=True), opens
    )
    held: dict[int, Literal] = {**covariates, **dict.fromkeys(sorted(claim.selected), True)}
    # (M2)
    way = claim.causal | {x}
    arcs = [(a, b) for b in sorted(claim.causal) for a in diagram.parents[b] if a in way]
    cut(program, "mediated", arcs, x, y, mediators, opens)
    # (M3)
    without_x = diagram.without_arrows_out_of([x])
    separated(program, "treatment's back doors", without_x, x, mediators, held)
    # (M4)
    given = {**held, x: True}
    separated(program, "mediators' back doors", diagram, y, mediators, given, mediators)
    return {"mediators": mediators, "covariates": covariates}

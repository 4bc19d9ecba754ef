"""Conditioning as rows of the integer program.

    Z ⊆ An({X, Y} ∪ S) \\ De(X), as variables                                              (C1)
    Z ∪ S cuts X from Y in the moral graph of G_nc on An({X, Y} ∪ S)                       (C2)

Because every candidate is an ancestor of X, Y or S, the ancestral set does not hang on what is
chosen, and separation in the diagram is separation in that one moral graph.

References
----------
Lauritzen, Dawid, Larsen & Leimer (1990), Independence properties of directed Markov fields,
Networks 20, for separation in the moral graph of the ancestral set.
"""

from planner.claims import Claim
from planner.diagram import Nodes
from planner.program import Literal, Program, RoleLiterals, cut
from planner.routes.conditioning.criterion import candidates

__all__ = ["write_rows"]


def write_rows(program: Program, claim: Claim, measurable: Nodes, opens: Literal) -> RoleLiterals:
    """Write (C1) and (C2)."""
    diagram = claim.diagram
    # (C1)
    people = diagram.by_name(candidates(claim, measurable).covariates)
    covariates = program.roles("covariate", zip(people, diagram.named(people), strict=True), opens)
    # (C2)
    ancestral = claim.noncausal.ancestors(claim.ends | claim.selected)
    edges = [
        edge
        for edge in claim.noncausal.moral_edges(sorted(ancestral))
        if not claim.selected & set(edge)
    ]
    arcs = [arc for a, b in edges for arc in ((a, b), (b, a))]
    cut(program, "back doors", arcs, claim.treatment, claim.outcome, covariates, opens)
    return {"covariates": covariates}

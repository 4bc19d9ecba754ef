"""How the mechanism is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="the mechanism",
    analysis="follow the effect through {mediators}, adjusting for {covariates}",
    bare_analysis="follow the effect through {mediators}, with no covariates",
    estimand="average effect",
    leans_on=(
        "the whole effect of {treatment} on {outcome} runs through {mediators} (statisticians call"
        " this full mediation)",
        "no common cause of the mediators and {treatment}, or of the mediators and {outcome}, is"
        " missing from the diagram",
        "every value of the mediators occurs whatever {treatment} is (positivity)",
    ),
    sentences={
        "closes": "left out, {path} would pass for part of the mechanism",
        "mediated": "By the diagram the whole effect runs through {all}, as in {path}; with the"
        " covariates adjusted for, no other open path passes for part of it.",
        "carried": "{others} already carries {path}; adjusting for it would take that away",
        "unmediated": "Nothing on the directed path {path} can be measured.",
        "unmediated:some": "No set of mediators will do: on the directed path {path}, something"
        " else passes for the work of {all}.",
        "mediator_back_door": "{path} passes for the work of {who}, whatever is measured.",
        "mediator_back_door:several": "Some path passes for the work of {who}, whatever is"
        " measured: with all that can be adjusted for, {path}, open because {others} is adjusted"
        " for, or a result of it.",
    },
)

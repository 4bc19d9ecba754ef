"""How the mechanism is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="the mechanism",
    analysis="follow the effect through {mediators}, adjusting for {covariates}",
    bare_analysis="follow the effect through {mediators}, with nothing to adjust for",
    estimand="average effect",
    leans_on=(
        "the mediators carry the whole effect of {treatment} on {outcome}",
        "nothing unmeasured drives the mediators together with {treatment} or with {outcome}",
        "every value of the mediators occurs with much and with little of {treatment} (positivity)",
    ),
    sentences={
        "mediated": "{all} carries the whole effect, as in {path}, and its own back doors are"
        " closed.",
        "mediated:several": "{all} together carry the whole effect, as in {path}, and their own"
        " back doors are closed.",
        "carried": "{others} already carries {path}; adjusting for it would take that away",
        "unmediated": "nothing on the directed path {path} can be measured.",
        "unmediated:some": "no set of mediators will do: on the directed path {path} a back door of"
        " {all} stays open.",
        "mediator_back_door": "{who} has the back door {path}, which stays open whatever is"
        " measured.",
    },
)

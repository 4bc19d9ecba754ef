"""How the mechanism is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="the mechanism",
    estimand="average effect",
    leans_on=(
        "the mediators carry the whole effect of {treatment} on {outcome}",
        "nothing unmeasured drives the mediators together with {treatment} or with {outcome}",
        "the mediators' values also occur without {treatment}",
    ),
    sentences={
        "mediated": "{all} carries the whole effect, as in {path}, and every back door of it is closed.",
        "mediated:several": "{all} together carry the whole effect, as in {path}, and every back door"
        " of theirs is closed.",
        "carried": "{others} already carries {path}; holding it constant would take that away",
        "unmediated": "The directed path {path} has no mediator that can be measured.",
        "unmediated:doors": "No set of mediators will do: on the directed path {path} a back door of"
        " {all} stays open.",
        "mediator_back_door": "The back door {path} of {who} stays open whatever is measured.",
    },
)

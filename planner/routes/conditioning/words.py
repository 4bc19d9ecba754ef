"""How conditioning is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="conditioning on covariates",
    estimand="average effect",
    leans_on=(
        "nothing unmeasured still drives both {treatment} and {outcome} once these covariates are held",
        "every stratum of the covariates holds units with much and with little of {treatment}",
    ),
    sentences={
        "back_doors_closed": "Holding {all} closes every path that could mix other causes into the effect.",
        "back_doors_closed:none": "No path mixes other causes into the effect; nothing has to be held.",
        "back_door_open": "The path {path} stays open whatever is measured.",
        "back_door_open:some": "Whatever is held, some path stays open; with all that can be held it is"
        " {path}, opened by holding {all}.",
    },
)

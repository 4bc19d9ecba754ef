"""How conditioning is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="conditioning on covariates",
    analysis="adjust for {covariates}",
    bare_analysis="compare units as they are, with nothing to adjust for",
    estimand="average effect",
    leans_on=(
        "nothing unmeasured still drives both {treatment} and {outcome} once the covariates are"
        " adjusted for",
        "among units alike in the covariates, some have much and some little of {treatment}"
        " (positivity)",
    ),
    sentences={
        "back_doors_closed": "adjusting for {all} closes every path that would mix other causes"
        " in.",
        "back_doors_closed:none": "no path mixes other causes in; there is nothing to adjust for.",
        "back_door_open": "the path {path} stays open whatever is measured.",
        "back_door_open:some": "some path stays open whatever is measured; adjusting for everything"
        " that can be leaves {path}, which is open because {all} is adjusted for, or what follows"
        " from it.",
    },
)

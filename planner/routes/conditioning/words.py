"""How conditioning is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="conditioning on covariates",
    analysis="adjust for {covariates}",
    bare_analysis="compare units as they are, with no covariates",
    estimand="average effect",
    leans_on=(
        "no common cause of {treatment} and {outcome} is missing from the diagram",
        "among units alike in the covariates, {treatment} still varies (statisticians call this"
        " positivity)",
    ),
    sentences={
        "closes": "left out, {path} would pass for an effect of {treatment}",
        "back_doors_closed": "adjusting for {all} stops every path that could pass for an effect.",
        "back_doors_closed:none": "no path could pass for an effect: nothing to adjust for.",
        "back_door_open": "the path {path} passes for an effect, whatever is measured.",
        "back_door_open:some": "some path passes for an effect, whatever is measured; if all that"
        " can be is adjusted for, it is {path}, let through because {all} is adjusted for, or what"
        " follows from it.",
    },
)

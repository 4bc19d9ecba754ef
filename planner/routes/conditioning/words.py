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
        "back_doors_closed": "Adjusting for {all} stops every path that could pass for an effect.",
        "back_doors_closed:none": "No path could pass for an effect: nothing to adjust for.",
        "back_door_open": "The path {path} passes for an effect, whatever is measured.",
        "back_door_open:some": "Some path passes for an effect, whatever is measured: with all that"
        " can be adjusted for, {path}, open because {all} is adjusted for, or a result of it.",
    },
)

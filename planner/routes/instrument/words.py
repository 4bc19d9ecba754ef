"""How an instrument is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="an instrument",
    analysis="use {instruments} as the instrument, which moves {treatment} and reaches {outcome} in"
    " no other way, adjusting for {covariates}",
    bare_analysis="use {instruments} as the instrument, which moves {treatment} and reaches"
    " {outcome} in no other way",
    estimand="average effect if it is the same for all; else the effect in compliers",
    leans_on=(
        "the instrument reaches {outcome} by way of {treatment} only (statisticians call this"
        " exclusion)",
        "either the effect is the same for every unit, or the instrument pushes nobody's"
        " {treatment} the other way; in the second case the result holds only for the units that"
        " it moves (compliers)",
        "the instrument moves {treatment} strongly (a strong first stage)",
    ),
    sentences={
        "closes": "left out, {path} would pass for the instrument's work",
        "keeps_link": "left out, the instrument would not be linked to {treatment}, {path}",
        "moves": "moves {treatment}, {path}",
        "cuts_link": "adjusting for it would undo the instrument's work, {path}",
        "instrument_found": "{all} moves {treatment}, {path}, and no path leads from it past"
        " {treatment} to {outcome}.",
        "no_instrument": "no variable can be the instrument; {who} comes closest.",
        "no_candidate": "nothing but {treatment} and {outcome} can be measured.",
        "comes_after": "{who} is a result of {treatment}, {path}.",
        "reaches_outcome": "{who} reaches {outcome} past {treatment}, {path}, and nothing that can"
        " be measured stops it.",
        "no_link": "{who} has no link to {treatment}.",
        "link_cut": "{who} is linked to {treatment}, {path}, but what stops its other paths to"
        " {outcome} cuts that link too.",
    },
)

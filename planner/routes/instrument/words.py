"""How an instrument is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="an instrument",
    analysis="use {instruments} as the instrument, adjusting for {covariates} (by the diagram it"
    " then reaches {outcome} only by way of {treatment})",
    bare_analysis="use {instruments} as the instrument (by the diagram it reaches {outcome} only by"
    " way of {treatment})",
    estimand="average effect if it is the same for all; else the effect in compliers",
    leans_on=(
        "{instruments} reaches {outcome} by way of {treatment} only, the covariates adjusted for"
        " (statisticians call this exclusion)",
        "either the effect is the same for every unit, or {instruments} pushes nobody's"
        " {treatment} the other way; in the second case the result holds only for the units that"
        " it moves (compliers)",
        "{instruments} moves {treatment} strongly enough{first_stage}",
    ),
    sentences={
        "closes": "left out, {path} would pass for the instrument's work",
        "keeps_link": "left out, nothing would link the instrument to {treatment} as {path} does",
        "moves": "moves {treatment}, {path}",
        "cuts_link": "adjusting for it would undo the instrument's work, {path}",
        "instrument_found": "The instrument {all} moves {treatment}, {path}, and with its"
        " covariates adjusted for no other open path leads from it to {outcome}.",
        "no_instrument": "No variable can be the instrument; {who} comes closest.",
        "no_candidate": "Nothing but {treatment} and {outcome} can be measured.",
        "comes_after": "{who} is a result of {treatment}, {path}.",
        "no_link": "Nothing links {who} to {treatment}; adjusting for a common result of both"
        " might, but would also open a path past {treatment} to {outcome}.",
        "reaches_outcome": "{who} reaches {outcome} past {treatment}, {path}, whatever is"
        " measured.",
        "reaches_outcome:several": "{who} reaches {outcome} past {treatment}, whatever is"
        " measured: with all adjusted for that could stop it, {path}, open because {others} is"
        " adjusted for, or a result of it.",
        "link_cut": "{who} is linked to {treatment}, {path}, but adjusting for what else joins it"
        " to {outcome} cuts that link.",
    },
)

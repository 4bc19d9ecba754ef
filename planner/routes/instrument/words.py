"""How an instrument is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="an instrument",
    analysis="use {instruments} as the instrument, adjusting for {covariates}",
    bare_analysis="use {instruments} as the instrument, with nothing to adjust for",
    estimand="average effect if it is the same for all; else the effect in compliers",
    leans_on=(
        "the instrument reaches {outcome} through {treatment} only (exclusion)",
        "the effect is the same for every unit; or the instrument moves nobody's {treatment} the"
        " wrong way, and then the effect is that of the units it moves (compliers)",
        "the instrument moves {treatment} strongly (first stage)",
    ),
    sentences={
        "instrument_found": "{all} moves the treatment, {path}, and no other open path leads from"
        " it to the outcome.",
        "no_instrument": "no variable can be the instrument; {who} comes closest.",
        "no_candidate": "nothing but treatment and outcome can be measured.",
        "comes_after": "{who} follows from the treatment, {path}.",
        "reaches_outcome": "{who} reaches the outcome past the treatment, {path}, and nothing that"
        " can be measured closes that path.",
        "no_link": "{who} has no link to the treatment.",
        "link_cut": "{who} is linked to the treatment, {path}, but what closes its paths to the"
        " outcome cuts that link too.",
    },
)

"""How an instrument is spoken of."""

from planner.routes.route import Words

__all__ = ["WORDS"]

WORDS = Words(
    title="an instrument",
    estimand="average effect if it is the same for all; else the effect in compliers",
    leans_on=(
        "the instrument reaches {outcome} through {treatment} only, once its covariates are held"
        " (exclusion)",
        "the effect is the same for every unit, or the instrument never moves anyone's {treatment}"
        " the wrong way, and then the effect is that of those it moves (compliers)",
        "the instrument moves {treatment} strongly enough (first stage)",
    ),
    sentences={
        "instrument_found": "{all} moves the treatment by {path}, and reaches the outcome by no other"
        " open path.",
        "no_instrument": "No variable can be the instrument; {who} comes closest.",
        "no_candidate": "Nothing but treatment and outcome can be measured, so there is no instrument.",
        "comes_after": "{who} follows from the treatment: {path}.",
        "reaches_outcome": "{who} reaches the outcome past the treatment, by {path}, and nothing that"
        " can be measured closes it.",
        "no_link": "{who} has no link to the treatment.",
        "link_cut": "{who} is linked to the treatment by {path}, but what closes its paths to the"
        " outcome cuts that link too.",
    },
)

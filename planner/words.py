"""Plain words for findings, routes and limits; the only place that words a reason."""

from collections.abc import Collection, Iterable
from itertools import zip_longest

from planner.findings import Reason, Trail
from planner.routes import ROUTES
from planner.study import HIDDEN, Effect, Study

__all__ = ["conjoined", "drawn", "estimand", "leans_on", "sentence"]

SHARED = {
    # Why a variable is measured.
    "treatment": "the cause in question",
    "outcome": "what {treatment} may change",
    "saves": "not needed for validity, but it steadies the estimate by more than it costs",
    "keeps_limits": "not needed for validity, but without it the plan would break one of its"
    " limits",
    "carries": "a step by which the effect works, {path}",
    # Why a variable is left out.
    "on_causal_path": "is a step by which the effect works, {path}; adjusting for it would take"
    " part of the effect away",
    "below_causal_path": "is a result of what {treatment} changes, {path}; comparing units alike in"
    " it can make the estimate wrong",
    "after_treatment": "is a result of {treatment}, {path}",
    "opens": "adjusting for it would let {path} pass for an effect, which it does not as it is",
    "unlinked": "no path that could mislead connects it with {others} here",
    "shielded": "adjusting for {others} already stops {path}",
    "selected": "has one and the same value in every row",
    # Why a whole route, or all of them, cannot be taken.
    "no_directed_path": "No directed path leads from {treatment} to {outcome}: by this diagram the"
    " effect is zero. Nine times in ten an arrow was forgotten.",
    "selection_after_treatment": "The rows are selected by a result of {treatment}, {path}: no"
    " analysis of the selected rows alone gives the effect.",
    "out_of_reach": "The route is open, but its readings leave too little of the effect: not even"
    " 1,000,000,000 records would show it.",
    "over_limits": "The route is open, but only beyond one of the limits {all}.",
    "over_limits:one": "The route is open, but only beyond the limit {all}.",
    "over_limits_together": "The route is open, but only beyond all of the limits {all}.",
    "out_of_time": "No plan within the limits was found in the time given, and none was ruled out.",
}
"""A sentence for each kind of finding that is no single route's own."""


def drawn(trail: Trail, unmeasurable: Collection[str] = ()) -> str:
    """Return a path as text; what cannot be measured stands in brackets.

    Examples
    --------
    >>> drawn(Trail(("x", "hidden common cause of x and c", "c", "y"), (False, True, True)))
    'x ← (hidden common cause) → c → y'
    >>> drawn(Trail(("x", "u", "y"), (False, True)), {"u"})
    'x ← (u) → y'
    """
    names = [
        "(hidden common cause)"
        if name.startswith(HIDDEN)
        else f"({name})"
        if name in unmeasurable
        else name
        for name in trail.names
    ]
    arrows = [" → " if forward else " ← " for forward in trail.forward]
    return "".join(word for pair in zip_longest(names, arrows, fillvalue="") for word in pair)


def conjoined(names: Iterable[str]) -> str:
    """Return names as they stand in a sentence.

    Examples
    --------
    >>> conjoined(["a", "b", "c"])
    'a, b and c'
    """
    names = list(names)
    return " and ".join(filter(None, [", ".join(names[:-1]), *names[-1:]]))


def sentence(
    reason: Reason, effect: Effect, route: str | None = None, unmeasurable: Collection[str] = ()
) -> str:
    """Return a reason in words, as the route words it where it does so itself.

    A kind may be worded differently for no variable, one, several, or any.
    """
    count = len(reason.variables)
    number = ("none", "one")[count] if count < 2 else "several"
    keys = (f"{reason.kind}:{number}", f"{reason.kind}:{'some' if count else 'none'}", reason.kind)
    own = ROUTES[route].words.sentences if route else {}
    template = next(words[key] for words in (own, SHARED) for key in keys if key in words)
    return template.format(
        path=drawn(reason.trail, unmeasurable),
        who=reason.variables[0] if count else "",
        others=conjoined(reason.variables[1:]),
        all=conjoined(reason.variables),
        treatment=effect.treatment,
        outcome=effect.outcome,
    )


def estimand(route: str, study: Study) -> str:
    """Return what a route estimates; with selected rows, the effect among the selected."""
    words = ROUTES[route].words.estimand
    if study.selected_by:
        return f"{words}, among rows selected by {conjoined(study.selected_by)}"
    return words


def leans_on(
    route: str,
    effect: Effect,
    *,
    instruments: Iterable[str] = (),
    mediators: Iterable[str] = (),
    first_stage: str = "",
) -> tuple[str, ...]:
    """Return what a route leans on, in plain words.

    Parameters
    ----------
    first_stage
        What is known of the strength of the instrument, as it ends a sentence.
    """
    return tuple(
        clause.format(
            treatment=effect.treatment,
            outcome=effect.outcome,
            instruments=conjoined(instruments),
            mediators=conjoined(mediators),
            first_stage=first_stage,
        )
        for clause in ROUTES[route].words.leans_on
    )

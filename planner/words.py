"""Plain words for findings, routes and limits; the only place that words a reason."""

from collections.abc import Iterable
from itertools import zip_longest

from planner.findings import Reason, Trail
from planner.routes import ROUTES
from planner.study import HIDDEN, Effect, Study

__all__ = ["conjoined", "drawn", "estimand", "leans_on", "sentence"]

SHARED = {
    # Why a variable is measured.
    "treatment": "the cause that is asked about",
    "outcome": "what it may change",
    "closes": "closes {path}",
    "keeps_link": "keeps open what the instrument acts by, {path}",
    "moves": "moves the treatment, {path}",
    "carries": "carries {path}",
    # Why a variable is left out.
    "on_causal_path": "lies on the way of the effect, {path}; adjusting for it would take part of"
    " the effect away",
    "below_causal_path": "follows from what the treatment changes, {path}; adjusting for it would"
    " distort the effect",
    "after_treatment": "follows from the treatment, {path}",
    "opens": "adjusting for it would open {path}, which is closed as it is",
    "cuts_link": "adjusting for it would cut what the instrument acts by, {path}",
    "unlinked": "no path along which it could mislead leads to {others}",
    "shielded": "adjusting for {others} already closes {path}",
    "selected": "has one and the same value in every row",
    # Why a whole route, or all of them, cannot be taken.
    "no_directed_path": "No directed path leads from {treatment} to {outcome}: by this diagram the"
    " effect is zero. Nine times in ten an arrow was forgotten.",
    "selection_after_treatment": "The rows are selected after the treatment, {path}: no analysis of"
    " the selected rows alone gives the effect.",
    "over_limits": "The route is open, but only beyond {all}.",
    "out_of_time": "No plan within the limits was found in the time given, and none was ruled out.",
}
"""A sentence for each kind of finding that is no single route's own."""


def drawn(trail: Trail) -> str:
    """Return a path as text, such as ``x ← c → y``.

    Examples
    --------
    >>> drawn(Trail(("x", "hidden common cause of x and y", "y"), (False, True)))
    'x ← hidden common cause → y'
    """
    names = ["hidden common cause" if name.startswith(HIDDEN) else name for name in trail.names]
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


def sentence(reason: Reason, effect: Effect, route: str | None = None) -> str:
    """Return a reason in words, as the route words it where it does so itself.

    A kind may be worded differently for no variable, one, several, or any.
    """
    count = len(reason.variables)
    number = ("none", "one")[count] if count < 2 else "several"
    keys = (f"{reason.kind}:{number}", f"{reason.kind}:{'some' if count else 'none'}", reason.kind)
    own = ROUTES[route].words.sentences if route else {}
    template = next(words[key] for words in (own, SHARED) for key in keys if key in words)
    return template.format(
        path=drawn(reason.trail),
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


def leans_on(route: str, effect: Effect) -> tuple[str, ...]:
    """Return what a route leans on, in plain words."""
    return tuple(
        clause.format(treatment=effect.treatment, outcome=effect.outcome)
        for clause in ROUTES[route].words.leans_on
    )

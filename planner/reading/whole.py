"""What can be said only of the study as a whole: names, circles, timing, prices, strengths."""

from collections.abc import Collection, Iterable, Mapping, Sequence
from decimal import ROUND_FLOOR, Context
from fractions import Fraction
from graphlib import TopologicalSorter
from math import ceil, floor, log10, sqrt

from costs.circles import circles, spelt_out
from costs.located import Located, shortened
from costs.prices import Name, PriceList
from costs.reading import Listed
from costs.tally import Overflow, Tally
from planner.linear import (
    LinearModel,
    coefficients_of,
    is_learnable,
    largest_effect,
    linear_model,
    missing_in_words,
    outcome_explained,
    units_per_unit,
    why_zero,
)
from planner.reading.variables import DrawnVariable
from planner.strengths import explained_shares
from planner.study import Effect, HiddenCause, Range, Study, shown_time

__all__ = [
    "check_arrows",
    "check_countable",
    "check_measurable",
    "check_priced",
    "check_strengths",
    "check_target",
    "check_timing",
    "check_units",
    "read_effect",
    "read_selected",
]

Drawn = Mapping[str, DrawnVariable]
ALMOST_ALL = 1 - 1e-9
"""A share of explained variance above this counts as all of it: rounding forgiven."""
RECORDS_INSTEAD = "size the study by its records, as in 'size: {records: 400}'"
THREE_DIGITS = Context(prec=3, rounding=ROUND_FLOOR)


def read_effect(place: Located, drawn: Drawn, measurable: Collection[str]) -> Effect | None:
    """Return the effect that is asked for; both ends are known, different and measurable."""
    found = place.entries(("treatment", "outcome"))
    names = {}
    for role in ("treatment", "outcome"):
        if role not in found:
            place.fault(f"names no {role}.", "Write it like {treatment: first, outcome: second}.")
        elif (name := known_variable(found[role], drawn)) is not None:
            names[role] = name
            if name not in measurable:
                mend = "Give it a way of measuring: no study can do without."
                found[role].fault(
                    f"'{shortened(name)}' is the {role}, and cannot be measured.", mend
                )
    if len(names) < 2:
        return None
    if names["treatment"] == names["outcome"]:
        place.fault("names one variable as treatment and as outcome.", "Name two variables.")
        return None
    return Effect(**names)


def read_selected(place: Located, drawn: Drawn) -> tuple[str, ...]:
    """Return the variables that have one and the same value in every row."""
    names = place.names()
    return tuple(name for name, each in names.items() if known_variable(each, drawn) is not None)


def known_variable(place: Located, drawn: Drawn) -> str | None:
    """Return the name of a variable of the diagram."""
    name = place.name()
    if name is not None and name not in drawn:
        place.fault(
            f"names the variable '{shortened(name)}', which is not there.",
            place.source.nearest(name, drawn),
        )
        return None
    return name


def check_priced(places: Mapping[str, Located], drawn: Drawn) -> None:
    """Say which variables of the price lists are not in the diagram."""
    for name, place in places.items():
        if name not in drawn:
            mend = place.source.nearest(name, drawn)
            place.fault(f"measures '{shortened(name)}', which is no variable of the study.", mend)


def check_measurable(drawn: Drawn, prices: PriceList) -> None:
    """Say which variables have neither a way nor the word that they have none, or both."""
    for name, each in drawn.items():
        if name in prices.ways and each.measurable is False:
            each.place.fault(
                "has a way of measuring, but says 'measurable: no'.", "Take one of the two out."
            )
        if name not in prices.ways and each.measurable is not False:
            mend = (
                "Give it 'per_unit' (0 if free), list it under 'prices', or write 'measurable: no'."
            )
            each.place.fault("has no price and no way of measuring.", mend)


def check_arrows(drawn: Drawn) -> list[str] | None:
    """Say which causes are unknown and which arrows run in a circle.

    Returns
    -------
    list or None
        Every variable, causes before their effects; None where that cannot be.
    """
    for each in drawn.values():
        for cause, place in each.cause_places.items():
            if cause not in drawn:
                mend = place.source.nearest(cause, drawn)
                place.fault(f"names the cause '{shortened(cause)}', which is no variable.", mend)
    before = {name: [c for c in each.cause_places if c in drawn] for name, each in drawn.items()}
    found = circles(before)
    for circle in found:
        place = drawn[circle[1]].cause_places[circle[0]]
        place.fault(
            f"closes a circle: {spelt_out(circle, ' → ')}.",
            "A cause cannot follow from its effect: take one of these arrows out.",
        )
    return None if found else list(TopologicalSorter(before).static_order())


def check_timing(drawn: Drawn, order: Sequence[str], waves: Sequence[str]) -> None:
    """Say which causes come later than their effect, also where untimed variables lie between."""
    latest: dict[str, str] = {}
    """For each variable, whichever of itself and its causes has the latest time."""
    for name in order:
        each = drawn[name]
        own = each.variable.when
        if own is not None:
            latest[name] = name
        for cause, place in each.cause_places.items():
            before = latest.get(cause)
            if before is None:
                continue
            time = time_of(drawn, before)
            if own is not None and time > own:
                first, then = shown_time(time, waves), shown_time(own, waves)
                place.fault(
                    f"'{shortened(before)}' (when: {first}) comes later than"
                    f" '{shortened(name)}' (when: {then}), which follows from it.",
                    "Correct one of the two times, or turn an arrow round.",
                )
            elif name not in latest or time > time_of(drawn, latest[name]):
                latest[name] = before


def time_of(drawn: Drawn, name: str) -> Fraction:
    """Return the time of a variable that has one."""
    when = drawn[name].variable.when
    assert when is not None, "only timed variables are remembered"
    return when


def check_strengths(
    drawn: Drawn, hidden: Sequence[HiddenCause], default: Range | None, order: Sequence[str]
) -> int:
    """Say which variables are explained to 100 % or more, and what factor would fit.

    Returns
    -------
    int
        Variables for which that would take too long to say.
    """
    variables = {name: each.variable for name, each in drawn.items()}
    every = coefficients_of(variables, hidden, default)
    # A cause that is no variable has been told of; none of the strengths is taken at its word then.
    causes = {
        name: into if into.keys() <= every.keys() else dict.fromkeys(c for c in into if c in every)
        for name, into in every.items()
    }
    names = [cause.name for cause in hidden] + list(order)
    shares = explained_shares(causes, names)
    for name, share in shares.items():
        if share is not None and share > ALMOST_ALL:
            # The largest factor of three digits that leaves some noise.
            places = 10 ** (3 + max(0, floor(log10(share) / 2)))
            factor = (ceil(places / sqrt(share) - 1e-9) - 1) / places
            drawn[name].place.fault(
                f"is explained to {100 * share:.1f} % by its causes; less than 100 % is possible.",
                f"Multiply the strengths of all arrows into it by {factor:g} or less.",
            )
    return sum(share is None for share in shares.values())


def check_countable(study: Study, size: Located, every: Iterable[Listed]) -> None:
    """Say whether no plan could be added up in whole numbers, with the dearest item's line."""
    tally = Tally.of(study.prices, study.terms)
    try:
        tally.lines(tally.first_level)
    except Overflow as overflow:
        places: dict[Name, Located] = {
            (each.variable, each.name) if each.variable else each.name: each.place for each in every
        }
        place = size if overflow.name is None else places[overflow.name]
        place.fault(
            str(overflow),
            "Lower prices or losses, or the number of records, or count in a larger unit of money.",
        )


def check_units(place: Located, effect: Effect, drawn: Drawn) -> None:
    """Say which end of the effect has no SD, and so no natural units to show effects in."""
    lacking = [n for n in (effect.treatment, effect.outcome) if not drawn[n].has_spread]
    if lacking:
        verb = "has" if len(lacking) == 1 else "have"
        named = " and ".join(f"'{shortened(name)}'" for name in lacking)
        place.fault(
            f"asks for natural units, but {named} {verb} neither 'sd' nor 'share'.",
            "Write 'sd: 12.5' there, or 'share: 0.3' for a yes/no variable.",
        )


def check_target(study: Study, place: Located) -> None:
    """Say what keeps the number of records from being worked out, if there is an effect to learn.

    That is strengths that are missing, an effect of zero, or no room for the effect to be detected.
    """
    (effect,) = study.effects
    if not is_learnable(study, effect):
        return
    if missing := missing_in_words(study, effect):
        place.fault(
            f"cannot be worked out: {missing}.",
            "Give each a strength in 'caused_by' or 'hidden_common_causes', write"
            f" 'default_strength: weak', or {RECORDS_INSTEAD}.",
        )
        return
    model = linear_model(study, effect)
    assert model is not None, "no strength is missing"
    if model.effect:
        check_room(study, effect, model, place)
    else:
        place.fault(
            f"finds no effect to size for: {why_zero(model, effect)}.",
            f"Correct the strengths along these paths, or {RECORDS_INSTEAD}.",
        )


def check_room(study: Study, effect: Effect, model: LinearModel, place: Located) -> None:
    """Say whether the effect to be detected leaves the outcome no noise."""
    share = outcome_explained(model, effect.outcome)
    if study.size.detect is None or share is None or share <= ALMOST_ALL:
        return
    largest = largest_effect(model, effect, ALMOST_ALL)
    mend = "Write 'detect: implied', or correct the strengths."
    if largest is not None:
        largest *= units_per_unit(study, effect)
        mend = f"Write {float(THREE_DIGITS.create_decimal_from_float(largest)):g} or less."
    place.fault(
        f"is an effect with which '{shortened(effect.outcome)}' is explained to"
        f" {100 * share:.1f} % by its causes; less than 100 % is possible.",
        mend,
    )

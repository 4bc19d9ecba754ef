"""What a study holds, and what is worth a second look before anything is searched."""

from collections.abc import Iterator
from dataclasses import asdict, dataclass
from datetime import date
from decimal import Decimal

from costs.bill import needed_by
from costs.located import listed, shortened
from planner.linear import (
    is_learnable,
    missing_in_words,
    model_as_drawn,
    units_per_unit,
    why_zero,
)
from planner.study import Size, Study, shown_time

__all__ = [
    "Summary",
    "left_unchecked",
    "out_of_date",
    "remarks",
    "resting_on_default",
    "size_in_words",
    "summary_of",
]

USUAL = Size()
"""Power and confidence where nobody named another."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Summary:
    """A study in figures."""

    title: str
    treatment: str
    outcome: str
    size: str
    """How large the study is to be, in words."""
    records: int | None
    """None where they are to be worked out."""
    effect: float | None
    """What the strengths imply, in ``effect_unit``; None where one that matters is missing."""
    effect_unit: str
    variables: int
    measurable: int
    hidden_common_causes: int
    arrows: int
    arrows_with_strength: int
    ways: int
    components: int
    free_ways: int
    """Ways with no price of their own: per unit, set-up or batch."""
    timed: int
    """Variables with a time."""
    times: tuple[str, ...]
    """The times that occur, earliest first."""
    remarks: tuple[str, ...]

    def as_dict(self) -> dict[str, object]:
        """Return the figures as plain values."""
        return asdict(self)


def summary_of(study: Study, today: date) -> Summary:
    """Return a study in figures, with remarks."""
    (effect,) = study.effects
    ways = [way for named in study.prices.ways.values() for way in named.values()]
    strengths = [s for each in study.variables.values() for s in each.causes.values()]
    model = model_as_drawn(study, effect)
    whens = [each.when for each in study.variables.values() if each.when is not None]
    return Summary(
        title=study.title,
        treatment=effect.treatment,
        outcome=effect.outcome,
        size=size_in_words(study.size, study.currency),
        records=study.size.records,
        effect=model.effect * units_per_unit(study, effect) if model else None,
        effect_unit="natural units of the outcome per unit of the treatment"
        if study.size.in_units
        else "outcome SDs per treatment SD",
        variables=len(study.variables),
        measurable=len(study.prices.ways),
        hidden_common_causes=len(study.hidden_causes),
        arrows=len(strengths),
        arrows_with_strength=sum(strength is not None for strength in strengths),
        ways=len(ways),
        components=len(study.prices.components),
        free_ways=sum(not (way.per_unit or way.setup or way.batch) for way in ways),
        timed=len(whens),
        times=tuple(shown_time(when, study.waves) for when in sorted(set(whens))),
        remarks=tuple(remarks(study, today)),
    )


def size_in_words(size: Size, currency: str) -> str:
    """Return how large a study is to be.

    Examples
    --------
    >>> size_in_words(Size(detect=0.12, confidence=0.9), "EUR")
    'detect 0.12 with power 0.8, confidence 0.9'
    >>> from fractions import Fraction
    >>> size_in_words(Size(spend=Fraction("60000.5")), "EUR")
    'as narrow an interval as 60,000.5 EUR buys'
    """
    if size.records is not None:
        words = f"{size.records:,} records"
    elif size.half_width is not None:
        words = f"half-width {size.half_width:g}"
    elif size.spend is not None:
        money = f"{Decimal(size.spend.numerator) / size.spend.denominator:,f} {currency}".strip()
        words = f"as narrow an interval as {money} buys"
    elif size.detect is not None:
        words = f"detect {size.detect:g} with power {size.power:g}"
    else:
        words = f"detect the effect that the strengths imply, with power {size.power:g}"
    if size.confidence != USUAL.confidence:
        words += f", confidence {size.confidence:g}"
    return f"{words}, in natural units" if size.in_units else words


def remarks(study: Study, today: date) -> Iterator[str]:
    """Return what is worth a second look."""
    yield from left_unchecked(study)
    yield from without_effect(study)
    yield from in_little_confidence(study)
    yield from out_of_date(study, today)
    yield from left_unread(study)
    yield from no_way_to_the_outcome(study)
    yield from outside_the_diagram(study)
    yield from beside_the_losses(study)
    yield from never_needed(study)
    yield from too_unreliable(study)
    yield from resting_on_default(study)


def left_unchecked(study: Study) -> Iterator[str]:
    """Say which wishes cannot be looked after, and what was not added up."""
    (effect,) = study.effects
    wishes = list(wishes_that_take_strengths(study))
    if wishes and is_learnable(study, effect):
        missing = missing_in_words(study, effect, most=3)
        if missing:
            yield f"{' and '.join(wishes)} cannot be applied: {missing}."
    if study.unchecked_strengths:
        yield (
            f"The strengths into {study.unchecked_strengths:,} variables were not added up: the"
            " diagram is too large for it."
        )


def wishes_that_take_strengths(study: Study) -> Iterator[str]:
    """Return the keys that are of no use as long as strengths are missing."""
    if study.tolerance.bias is not None:
        yield "tolerance.bias"
    # A floor of 0 switches the check off.
    if study.tolerance.first_stage_f:
        yield "tolerance.first_stage_F"
    if study.size.confidence != USUAL.confidence:
        yield "size.confidence"


def without_effect(study: Study) -> Iterator[str]:
    """Say if the strengths make the effect zero although a directed path leads there."""
    (effect,) = study.effects
    model = model_as_drawn(study, effect)
    if model is not None and not model.effect and is_learnable(study, effect):
        yield f"By the strengths the effect is zero: {why_zero(model, effect)}."


def in_little_confidence(study: Study) -> Iterator[str]:
    """Say if the confidence looks like its opposite."""
    if study.size.confidence < 0.5:
        yield (
            f"size.confidence is {study.size.confidence:g}: intervals would miss the effect more"
            " often than not. 0.95 is usual."
        )


def out_of_date(study: Study, today: date) -> Iterator[str]:
    """Say which price lists are no longer valid."""
    for source in study.price_sources:
        if source.valid_until is not None and source.valid_until < today:
            yield f"The prices in {source.path} were valid until {source.valid_until}."


def left_unread(study: Study) -> Iterator[str]:
    """Say which sheets of a price list were passed over."""
    for source in study.price_sources:
        if source.unread:
            yield (
                f"{source.path}: {listed(source.unread)} begins with no row of column names, and"
                " was not read."
            )


def no_way_to_the_outcome(study: Study) -> Iterator[str]:
    """Say if no directed path leads from treatment to outcome."""
    for effect in study.effects:
        if effect.treatment not in causes_of(effect.outcome, study):
            yield (
                f"No directed path leads from {effect.treatment} to {effect.outcome}: by this"
                " diagram the effect is zero. Nine times in ten an arrow was forgotten."
            )


def causes_of(variable: str, study: Study) -> set[str]:
    """Return everything with a directed path into a variable."""
    found, stack = {variable}, [variable]
    while stack:
        for cause in study.variables[stack.pop()].causes:
            if cause not in found:
                found.add(cause)
                stack.append(cause)
    return found


def outside_the_diagram(study: Study) -> Iterator[str]:
    """Say which variables have no arrow at all."""
    joined = {name for name, each in study.variables.items() if each.causes}
    joined |= {cause for each in study.variables.values() for cause in each.causes}
    joined |= {name for hidden in study.hidden_causes for name in hidden.of}
    alone = [name for name in study.variables if name not in joined]
    if alone:
        yield f"No arrow leads into or out of {listed(alone)}."


def beside_the_losses(study: Study) -> Iterator[str]:
    """Say which ways are paid for units that an always bought component loses."""
    prices = study.prices
    needs = {
        f"{variable}.{way}": needed_by(purchase.needs, prices)
        for variable, named in prices.ways.items()
        for way, purchase in named.items()
    }
    for name, component in prices.components.items():
        if not component.always or component.yields == 1:
            continue
        beside = [way for way, needed in needs.items() if name not in needed]
        if beside:
            verb = "does" if len(beside) == 1 else "do"
            yield (
                f"'{shortened(name)}' is always bought and yields {float(component.yields):g}, but"
                f" {listed(beside)} {verb} not need it: paid for every unit started, also for those"
                " that are lost."
            )


def never_needed(study: Study) -> Iterator[str]:
    """Say which components nothing needs."""
    prices = study.prices
    needs = [way.needs for named in prices.ways.values() for way in named.values()]
    needs += [component.needs for component in prices.components.values()]
    wanted = {name for names in needs for name in names}
    idle = [
        name
        for name, component in prices.components.items()
        if name not in wanted and not component.always
    ]
    if idle:
        yield f"Nothing needs {listed(idle)}."


def too_unreliable(study: Study) -> Iterator[str]:
    """Say which variables have no way that is reliable enough."""
    least = study.tolerance.least_reliability
    if least is not None:
        poor = [
            name
            for name, named in study.prices.ways.items()
            if all(way.reliability < least for way in named.values())
        ]
        if poor:
            yield f"No way of measuring {listed(poor)} reaches a reliability of {float(least):g}."


def resting_on_default(study: Study) -> Iterator[str]:
    """Say how many arrows rest on the default strength."""
    if study.default_strength is not None:
        strengths = [s for each in study.variables.values() for s in each.causes.values()]
        resting = sum(strength is None for strength in strengths)
        resting += 2 * sum(hidden.strength is None for hidden in study.hidden_causes)
        verb = "arrow rests" if resting == 1 else "arrows rest"
        yield f"{resting} {verb} on the default strength."

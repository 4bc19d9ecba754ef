"""What a plan achieves, in words: how many records and why, interval, chances, bias."""

from collections.abc import Iterable, Mapping
from dataclasses import replace
from fractions import Fraction
from math import isfinite

from costs.bill import Bill, bill_for
from costs.prices import MOST_RECORDS
from planner.limits import MOST_MODELLED, money
from planner.linear import is_learnable, missing_in_words, model_as_drawn, why_zero
from planner.plan import Plan
from planner.precision import FORGIVEN, Precision, forgiving_ceil
from planner.report.numbers import (
    at_least,
    at_most,
    counted,
    figure,
    percent,
    percent_at_least,
    price_of,
)
from planner.study import Effect, Study
from planner.words import leans_on

__all__ = [
    "bias_sources",
    "effect_unit",
    "first_stage_sets_records",
    "interval",
    "interval_name",
    "joint_errors",
    "leanings",
    "real_price",
    "size_sentences",
    "why_unknown",
]


def effect_unit(study: Study, effect: Effect, sds: str = "SDs") -> str:
    """Return in what units the effect is told.

    With ``in: units`` those that the variables are measured in, or their names where nobody said.

    Parameters
    ----------
    sds
        What standard deviations are called.
    """
    if not study.size.in_units:
        return f"outcome {sds} per treatment SD"
    outcome, treatment = (
        study.variables[name].texts.get("measured_in", f"units of {name}")
        for name in (effect.outcome, effect.treatment)
    )
    return f"{outcome} per {treatment}"


def interval_name(study: Study) -> str:
    """Return what a confidence interval is called."""
    return f"{100 * study.size.confidence:g} % confidence interval"


def interval(study: Study, half_width: float) -> str:
    """Return a confidence interval in words."""
    width = f"of ± {at_most(half_width)}" if isfinite(half_width) else "without end"
    return f"{interval_name(study)} {width}"


# --------------------------------------------------------------------------- how many, and why so


def size_sentences(study: Study, effect: Effect, plan: Plan) -> str:
    """Return how many records a plan takes and why so many, what is started, and the price."""
    bill, size = plan.buy.bill, study.size
    records = counted(bill.records, "complete record")
    start = f"start {counted(bill.started, 'unit')}: {price_of(bill.total, study.currency)} in all."
    precision = plan.precision
    if precision is None:
        why = why_unknown(study, effect)
        enough = f"{'is' if bill.records == 1 else 'are'} enough is not worked out"
        return f"To end with {records}, {start} Whether {bill.records:,} {enough}: {why}."
    unit = effect_unit(study, effect)
    detected = f"the effect of {figure(precision.effect)}{named_by(study)}"
    power = f"a chance of {percent_at_least(precision.power)} (power)"
    if size.records is not None:
        return (
            f"To end with {records}, {start} They give a {interval(study, precision.half_width)}"
            f" ({unit}) and detect {detected} with {power}."
        )
    if size.spend is not None:
        return (
            f"{price_of(money(study), study.currency)} buys {records} and with them a"
            f" {interval(study, precision.half_width)} ({unit}), which detects {detected} with"
            f" {power}. To end with so many{on_average(bill)}, {start}"
        )
    if size.half_width is not None:
        wanted = f"for a {interval(study, size.half_width)} ({unit})"
    else:
        chance = percent(Fraction(str(size.power)))
        wanted = f"to detect {detected} ({unit}) with a chance of {chance} (power)"
    why = first_stage_sets_records(study, precision, bill)
    return f"It takes {records} {wanted}{why}. To end with so many{on_average(bill)}, {start}"


def on_average(bill: Bill) -> str:
    """Return that losses are averages, where there are any."""
    return "" if bill.kept == 1 else " on average"


def named_by(study: Study) -> str:
    """Return where the effect is from, if not from the wish to detect it."""
    return "" if study.size.detect is not None else " that the strengths imply"


def first_stage_sets_records(study: Study, precision: Precision, bill: Bill) -> str:
    """Return that the first stage asks for so many records, if it does."""
    floor = study.tolerance.floor_of_f
    if precision.first_stage_f is None or not floor:
        return ""
    # One record fewer, and the instrument would be too weak.
    fewer = precision.first_stage_f * (bill.records - 1) / bill.records
    asked_for = fewer < float(floor) * (1 - FORGIVEN)
    return f", so many because the first-stage F is to reach {float(floor):g}" if asked_for else ""


def why_unknown(study: Study, effect: Effect) -> str:
    """Return why it is not known what a plan achieves."""
    missing = missing_in_words(study, effect, most=3)
    if missing or not is_learnable(study, effect):
        return missing
    model = model_as_drawn(study, effect)
    if model is not None and not model.effect:
        return f"by the strengths the effect is zero, as {why_zero(model, effect)}"
    return f"that is done for up to {MOST_MODELLED:,} variables"


def real_price(study: Study, plan: Plan, other: Plan) -> Bill | None:
    """Return what a plan would cost on so many records that it is as precise as another.

    The half-width shrinks with √(n − measured − 1). None where no number of records would do.
    """
    own, wanted = plan.precision, other.precision
    assert own is not None, "precision is known"
    assert wanted is not None, "precision is known"
    if not isfinite(own.half_width) or not wanted.half_width:
        return None
    measured = len(plan.buy.measure)
    freedom = plan.buy.bill.records - measured - 1
    more = forgiving_ceil(freedom * (own.half_width / wanted.half_width) ** 2) + measured + 1
    if more > MOST_RECORDS:
        return None
    return bill_for(plan.buy.bill.ways, study.prices, replace(study.terms, records=more))


# ------------------------------------------------------------------------------ what it leans on


def leanings(study: Study, effect: Effect, route: str, plan: Plan) -> Iterable[str]:
    """Return what the price of a plan leans on, and what no price can mend."""
    yield from leans_on(
        route,
        effect,
        instruments=plan.instruments,
        mediators=plan.mediators,
        first_stage=first_stage(study, plan),
    )
    yield from reading_errors(study, effect, plan)


def first_stage(study: Study, plan: Plan) -> str:
    """Return how strong the instrument is, as far as it is known."""
    if plan.precision is None or plan.precision.first_stage_f is None:
        return " (statisticians speak of a strong first stage)"
    floor = study.tolerance.floor_of_f
    least = f", and at least {float(floor):g} is asked for" if floor else ""
    return (
        f": by the strengths the first-stage F is {at_least(plan.precision.first_stage_f)}{least}"
    )


def reading_errors(study: Study, effect: Effect, plan: Plan) -> Iterable[str]:
    """Return what the errors of the readings do to the estimate."""
    erring = [
        variable
        for variable, way in plan.buy.measure.items()
        if study.prices.ways[variable][way].reliability < 1
    ]
    if plan.precision is None:
        if set(erring) - {effect.outcome}:
            yield (
                "the readings: whether their errors put the estimate off is not worked out, nor"
                " would more records mend it"
            )
        return
    sources = bias_sources(plan.precision)
    if plan.precision.bias_bound > FORGIVEN:
        worst = next((f" (largest: {name}, {share})" for name, share in sources.items()), "")
        yield (
            "the readings: their errors put the estimate off by up to about"
            f" {percent(Fraction(plan.precision.bias_bound))} of the effect{worst}, and more"
            " records do not make that less"
        )


def joint_errors(study: Study, plan: Plan) -> Iterable[str]:
    """Return what is taken for granted of errors that might go together."""
    ways = [study.prices.ways[variable][way] for variable, way in plan.buy.measure.items()]
    if plan.precision is not None and sum(way.reliability < 1 for way in ways) > 1:
        yield (
            "errors that have nothing to do with each other: those of one interview may go together"
        )


def bias_sources(precision: Precision) -> Mapping[str, str]:
    """Return by reading how much it puts the estimate off alone, the worst first.

    What is no more than a rounding error is left out.
    """
    return {
        name: percent(Fraction(share))
        for name, share in precision.bias_sources.items()
        if share > FORGIVEN
    }

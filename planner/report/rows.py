"""The rows of a report's tables, rounded and in order."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from costs.bill import DIRECT, Bill, Line, running_price
from costs.prices import Purchase
from planner.plan import Buy, Plan, RouteAnswer
from planner.precision import FORGIVEN, Precision
from planner.report.achieved import (
    bias_sources,
    effect_unit,
    interval_name,
    leanings,
    why_unknown,
)
from planner.report.answers import beyond_limits
from planner.report.numbers import (
    at_least,
    at_most,
    exact,
    exact_money,
    figure,
    money,
    percent,
    percent_at_least,
    price_of,
)
from planner.report.spared import worth_of_extra
from planner.study import Effect, Study
from planner.words import conjoined, estimand, sentence

__all__ = [
    "BillRow",
    "Bought",
    "Note",
    "RouteRow",
    "bill_rows",
    "bought_rows",
    "burden_notes",
    "left_out_notes",
    "precision_notes",
    "route_row",
    "sum_notes",
]

NOTHING = "–"
"""Stands where there is nothing to pay, or nothing to say."""
STATUS_WORDS = {"feasible": "open", "over_limits": "beyond limits", "impossible": "closed"}


@dataclass(frozen=True, kw_only=True, slots=True)
class Bought:
    """One thing that is bought, as a row of the measurement list."""

    name: str
    part: str
    """Its role, or ``component``."""
    is_extra: bool
    """Whether validity could do without it."""
    way: str
    how: str
    units: str
    """Units for which it is paid."""
    each: str
    """Price per unit, burdens included, and per batch."""
    once: str
    """Set-up."""
    amount: str
    """What it comes to."""
    why: str


@dataclass(frozen=True, kw_only=True, slots=True)
class BillRow:
    """One line of the bill."""

    name: str
    units: str
    setup: str
    per_unit: str
    batches: str
    burdens: str
    amount: str


@dataclass(frozen=True, slots=True)
class Note:
    """Something said about one thing."""

    name: str
    text: str


@dataclass(frozen=True, kw_only=True, slots=True)
class RouteRow:
    """One route beside the others."""

    name: str
    status: str
    total: str
    each: str
    once: str
    variables: str
    records: str
    started: str
    half_width: str
    """Empty, like all that follows from it, where precision is not known."""
    power: str
    coverage: str
    bias: str
    worst: str
    """The reading that puts the estimate off most."""
    first_stage: str
    estimand: str
    leans_on: tuple[str, ...]
    reason: str
    witnesses: tuple[str, ...]


# --------------------------------------------------------------------------------- what is measured


def bought_rows(plan: Plan, route: str, effect: Effect, study: Study) -> Iterable[Bought]:
    """Return a row for each variable that is measured, then for each component."""
    lines = {line.name: line for line in plan.buy.bill.lines}
    for variable, way in plan.buy.measure.items():
        purchase = study.prices.ways[variable][way]
        reason = plan.needed[variable]
        is_extra = variable in plan.extras
        yield bought_row(
            purchase,
            lines[f"{variable}.{way}"],
            study,
            name=variable,
            part=plan.role(variable) or reason.kind,
            way=way,
            how=purchase.label or study.variables[variable].label,
            is_extra=is_extra,
            why=worth_of_extra(variable, plan, route, effect, study)
            if is_extra
            else sentence(reason, effect, route, study.unmeasurable),
        )
    for name in plan.buy.bill.components:
        component = study.prices.components[name]
        yield bought_row(
            component,
            lines[name],
            study,
            name=name,
            part="component",
            is_extra=False,
            way="",
            how=component.label,
            why=component_reason(name, plan.buy, study),
        )


def bought_row(
    purchase: Purchase, line: Line, study: Study, *, is_extra: bool, **words: str
) -> Bought:
    """Return a row, with its prices and what they come to."""
    return Bought(
        is_extra=is_extra,
        units=f"{line.units:,}",
        each=price_each(purchase, study),
        once=money(purchase.setup) if purchase.setup else NOTHING,
        amount=money(line.amount) if line.amount else NOTHING,
        **words,
    )


def component_reason(name: str, buy: Buy, study: Study) -> str:
    """Return why a component is bought."""
    prices = study.prices
    users = [
        variable
        for variable, way in buy.measure.items()
        if name in prices.ways[variable][way].needs
    ]
    users += [each for each in buy.bill.components if name in prices.components[each].needs]
    if prices.components[name].always:
        return "a cost of every plan"
    return f"serves {conjoined(users)}"


def price_each(purchase: Purchase, study: Study) -> str:
    """Return what each unit costs, its burdens included; a batch beside it."""
    each = running_price(purchase, study.terms)
    # To the last digit, so that units times price is what the line says.
    parts = [exact_money(each)] if each else []
    if purchase.batch is not None:
        parts.append(f"{money(purchase.batch.price)} per {purchase.batch.holds}")
    return " + ".join(parts) or NOTHING


def left_out_notes(
    plan: Plan, route: str, effect: Effect, study: Study, *, only_never: bool
) -> tuple[Note, ...]:
    """Return why variables are left out: those that must not be held, or all the others."""
    return tuple(
        Note(name, sentence(reason, effect, route, study.unmeasurable))
        for name, reason in plan.left_out.items()
        if (name in plan.never) == only_never
    )


# -------------------------------------------------------------------------------- money and burdens


def sum_notes(bill: Bill) -> Iterable[Note]:
    """Return surcharges and the total, for the foot of the measurement list."""
    for line in bill.lines:
        if line.kind not in DIRECT:
            yield Note(line.kind, money(line.amount))
    yield Note("total", money(bill.total))


def bill_rows(bill: Bill) -> Iterable[BillRow]:
    """Return the bill, line by line, and its total."""
    for line in bill.lines:
        yield bill_row(line)
    yield BillRow(
        name="total",
        units="",
        setup="",
        per_unit="",
        batches="",
        burdens="",
        amount=money(bill.total),
    )


def bill_row(line: Line) -> BillRow:
    """Return one line of the bill; what is nothing stays empty."""

    def shown(part: Fraction) -> str:
        return money(part) if part else ""

    return BillRow(
        name=line.name,
        units=f"{line.units:,}" if line.units else "",
        setup=shown(line.setup),
        per_unit=shown(line.per_unit),
        batches=shown(line.batches),
        burdens=shown(line.burdens),
        amount=money(line.amount),
    )


def burden_notes(buy: Buy, study: Study) -> Iterable[Note]:
    """Return what one unit has to bear."""
    for name, taken in buy.bill.burdens.items():
        limit = study.terms.burdens[name].limit
        most = "" if limit is None else f", of at most {exact(limit)}"
        yield Note(study.terms.burdens[name].label or name, f"{exact(taken)}{most}")


# --------------------------------------------------------------------------------------- all routes


def route_row(
    answer: RouteAnswer, effect: Effect, study: Study, *, is_recommended: bool, is_shown: bool
) -> RouteRow:
    """Return one route beside the others; beyond the limits, with the plan that would do.

    What the shown plan leans on is not said again.
    """
    plan = answer.plan or answer.beyond
    bill = plan.buy.bill if plan else None
    return RouteRow(
        name=answer.route,
        status="recommended"
        if is_recommended and len(study.routes) > 1
        else STATUS_WORDS[answer.status],
        total=price_of(bill.total, study.currency) if bill else NOTHING,
        each=money(bill.next_unit) if bill else NOTHING,
        once=money(bill.setup) if bill else NOTHING,
        variables=str(len(plan.buy.measure)) if plan else NOTHING,
        records=f"{bill.records:,}" if bill else NOTHING,
        started=f"{bill.started:,}" if bill else NOTHING,
        **precision_cells(plan.precision if plan else None),
        estimand=estimand(answer.route, study),
        leans_on=tuple(leanings(study, effect, answer.route, plan))
        if plan and not is_shown
        else (),
        reason=beyond_limits(answer, effect, study),
        witnesses=tuple(
            sentence(each, effect, answer.route, study.unmeasurable) for each in answer.witnesses
        ),
    )


def precision_cells(precision: Precision | None) -> dict[str, str]:
    """Return what a plan achieves, a short text each; empty where it is not known."""
    if precision is None:
        return dict.fromkeys(PRECISION_CELLS, "")
    worst = next((f"{share}, {name}" for name, share in bias_sources(precision).items()), "")
    f = precision.first_stage_f
    cells = (
        f"± {at_most(precision.half_width)}",
        percent_at_least(precision.power),
        percent_at_least(precision.coverage),
        percent(Fraction(precision.bias_bound)) if precision.bias_bound > FORGIVEN else "none",
        worst,
        "" if f is None else at_least(f),
    )
    return dict(zip(PRECISION_CELLS, cells, strict=True))


PRECISION_CELLS = ("half_width", "power", "coverage", "bias", "worst", "first_stage")


def precision_notes(plan: Plan, study: Study, effect: Effect) -> Iterable[Note]:
    """Return what a plan achieves, line by line, for the workbook."""
    precision = plan.precision
    yield Note("complete records", f"{plan.buy.bill.records:,}")
    yield Note("units started", f"{plan.buy.bill.started:,}")
    if precision is None:
        yield Note("precision", f"not worked out: {why_unknown(study, effect)}")
        return
    cells = precision_cells(precision)
    yield Note("effects are in", effect_unit(study, effect))
    yield Note("effect that is taken to be true", figure(precision.effect))
    yield Note("what the readings make of it", figure(precision.limit))
    yield Note(f"{interval_name(study)} (half-width)", cells["half_width"])
    yield Note("chance to detect the effect (power)", cells["power"])
    yield Note("chance that the interval holds the effect (coverage)", cells["coverage"])
    yield Note("bias by errors of readings, up to about", cells["bias"])
    for name, share in bias_sources(precision).items():
        yield Note(f"  alone by {name}", share)
    if cells["first_stage"]:
        yield Note("strength of the instrument (first-stage F)", cells["first_stage"])

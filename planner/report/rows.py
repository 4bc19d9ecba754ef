"""The rows of a report's tables, rounded and in order."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from costs.bill import DIRECT, Bill, Line, running_price
from costs.prices import Purchase
from planner.plan import Buy, Plan, RouteAnswer
from planner.report.answers import beyond_limits, price_of
from planner.report.numbers import exact, money
from planner.study import Effect, Study
from planner.words import conjoined, estimand, leans_on, sentence

__all__ = [
    "BillRow",
    "Bought",
    "Note",
    "RouteRow",
    "bill_rows",
    "bought_rows",
    "burden_notes",
    "left_out_notes",
    "route_row",
    "sum_notes",
]

NOTHING = "–"
"""Stands where there is nothing to pay, or nothing to say."""
STATUS_WORDS = {"feasible": "open", "over_limits": "beyond the limits", "impossible": "closed"}


@dataclass(frozen=True, kw_only=True, slots=True)
class Bought:
    """One thing that is bought, as a row of the measurement list."""

    name: str
    part: str
    """Its role, or ``component``."""
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
        yield bought_row(
            purchase,
            lines[f"{variable}.{way}"],
            study,
            name=variable,
            part=plan.role(variable) or reason.kind,
            way=way,
            how=purchase.label or study.variables[variable].label,
            why=sentence(reason, effect, route, study.unmeasurable),
        )
    for name in plan.buy.bill.components:
        component = study.prices.components[name]
        yield bought_row(
            component,
            lines[name],
            study,
            name=name,
            part="component",
            way="",
            how=component.label,
            why=component_reason(name, plan.buy, study),
        )


def bought_row(purchase: Purchase, line: Line, study: Study, **words: str) -> Bought:
    """Return a row, with its prices and what they come to."""
    return Bought(
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
    parts = [money(each)] if each else []
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


def route_row(answer: RouteAnswer, effect: Effect, study: Study) -> RouteRow:
    """Return one route beside the others; beyond the limits, with the plan that would do."""
    plan = answer.plan or answer.beyond
    return RouteRow(
        name=answer.route,
        status=STATUS_WORDS[answer.status],
        total=price_of(plan.buy.bill.total, study) if plan else NOTHING,
        each=money(plan.buy.bill.next_unit) if plan else NOTHING,
        once=money(plan.buy.bill.setup) if plan else NOTHING,
        variables=str(len(plan.buy.measure)) if plan else NOTHING,
        estimand=estimand(answer.route, study),
        leans_on=leans_on(answer.route, effect) if plan else (),
        reason=beyond_limits(answer, effect, study),
        witnesses=tuple(
            sentence(each, effect, answer.route, study.unmeasurable) for each in answer.witnesses
        ),
    )

"""What every report shows: words and rounded numbers, in order, with no arithmetic left to do."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from costs.bill import Line
from costs.prices import Purchase
from planner.plan import Buy, EffectAnswer, Exceeded, Plan, Recommendation, RouteAnswer
from planner.report.numbers import counted, money, percent, plain
from planner.routes import ROUTES
from planner.study import Effect, Study
from planner.words import conjoined, estimand, leans_on, sentence

__all__ = ["BillRow", "Bought", "Note", "RouteRow", "View", "view_of"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Bought:
    """One thing that is bought, as a row of the measurement list."""

    name: str
    part: str
    """Its role, or ``component``."""
    way: str
    how: str
    each: str
    """Price per unit, burdens included, and per batch."""
    once: str
    """Set-up."""
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


@dataclass(frozen=True, kw_only=True, slots=True)
class View:
    """A whole report."""

    title: str
    subject: str
    answer: tuple[str, ...]
    bought: tuple[Bought, ...]
    legend: tuple[str, ...]
    """How to read the paths in it."""
    never: tuple[Note, ...]
    leans_on: tuple[str, ...]
    cautions: tuple[str, ...]
    bill: tuple[BillRow, ...]
    currency: str
    burdens: tuple[Note, ...]
    routes: tuple[RouteRow, ...]
    left_out: tuple[Note, ...]
    notes: tuple[str, ...]
    shown_plan: str
    """Whose measurement list and bill are shown; empty where the plan is the recommended one."""


def view_of(answer: Recommendation) -> View:
    """Return what a report on an answer shows."""
    study, (effect_answer,) = answer.study, answer.effects
    effect = effect_answer.effect
    shown = shown_route(effect_answer)
    plan = None if shown is None else shown.plan or shown.beyond
    buy = answer.buy or (plan.buy if plan else None)
    return View(
        title=study.title,
        subject=subject(study, effect),
        answer=tuple(answer_sentences(answer, effect_answer)),
        bought=tuple(bought_rows(plan, shown.route, effect, study)) if plan and shown else (),
        legend=legend(plan) if plan else (),
        never=notes(plan, effect, shown.route, only_never=True) if plan and shown else (),
        leans_on=leans_on(shown.route, effect) if shown else (),
        cautions=tuple(cautions(buy, study)) if buy else (),
        bill=tuple(bill_rows(buy)) if buy else (),
        currency=study.currency,
        burdens=tuple(burden_notes(buy, study)) if buy else (),
        routes=tuple(route_row(each, effect, study) for each in effect_answer.routes),
        left_out=notes(plan, effect, shown.route, only_never=False) if plan and shown else (),
        notes=tuple(closing_notes(study, buy)),
        shown_plan="" if answer.buy or not shown else ROUTES[shown.route].words.title,
    )


def shown_route(answer: EffectAnswer) -> RouteAnswer | None:
    """Return the recommended route, or the one that comes nearest; None if there is none."""
    if answer.recommended is not None:
        return answer.answer(answer.recommended)
    beyond = [(each.beyond.buy.bill.total, each) for each in answer.routes if each.beyond]
    return min(beyond, key=lambda pair: pair[0], default=(Fraction(0), None))[1]


def subject(study: Study, effect: Effect) -> str:
    """Return what is asked, on how many records."""
    records = counted(study.terms.records, "complete record")
    among = f", among rows selected by {conjoined(study.selected_by)}" if study.selected_by else ""
    return (
        f"The effect of {effect.treatment} on {effect.outcome}{among}. {records}, one for each"
        f" {study.unit}."
    )


# --------------------------------------------------------------------------------------- the answer


def answer_sentences(answer: Recommendation, effect_answer: EffectAnswer) -> Iterable[str]:
    """Return the answer in a few sentences: what to do, for how much, and how sure that is."""
    study, effect = answer.study, effect_answer.effect
    if answer.buy is not None and effect_answer.recommended is not None:
        route = effect_answer.answer(effect_answer.recommended)
        assert route.plan, "the recommended route has a plan"
        yield recommendation(study, answer.buy, route.route, route.plan)
        yield proof(study, answer.buy)
        if route.plan.instruments:
            yield from weak_instrument(study, effect_answer, route)
    elif answer.status == "no_effect":
        yield sentence(effect_answer.routes[0].reason, effect)
    elif answer.status == "over_limits":
        yield "No plan stays within the limits."
        for each in effect_answer.routes:
            yield f"By {ROUTES[each.route].words.title}: {over_limits(each, effect, study)}"
    else:
        yield "No route leads to this effect with what can be measured."
        for each in effect_answer.routes:
            words = ROUTES[each.route].words.title
            yield f"By {words}: {sentence(each.reason, effect, each.route)}"


def recommendation(study: Study, buy: Buy, route: str, plan: Plan) -> str:
    """Return what to do, in one sentence."""
    things = counted(len(buy.measure), "variable")
    records = counted(buy.bill.records, "complete record")
    price = price_of(buy.bill.total, study)
    return f"Measure {things} on {records} for {price} in all, and {analysis(route, plan)}."


def analysis(route: str, plan: Plan) -> str:
    """Return what is done with the readings."""
    words = ROUTES[route].words
    template = words.analysis if plan.covariates else words.bare_analysis
    return template.format(
        covariates=conjoined(plan.covariates),
        instruments=conjoined(plan.instruments),
        mediators=conjoined(plan.mediators),
    )


def proof(study: Study, buy: Buy) -> str:
    """Return how sure it is that nothing cheaper would do."""
    if buy.proved:
        return "This is proved: by this diagram and these prices, no allowed plan costs less."
    gap = percent(1 - buy.lower_bound / buy.bill.total) if buy.bill.total else percent(Fraction(0))
    bound = price_of(buy.lower_bound, study)
    return (
        f"This is the best plan found in the time given. No plan costs less than {bound}, so at"
        f" most {gap} could still be saved."
    )


def weak_instrument(study: Study, answer: EffectAnswer, route: RouteAnswer) -> Iterable[str]:
    """Return what a weak instrument costs in records, and the best other route beside it."""
    yield (
        "Mind the instrument: to be as precise as adjusting for covariates it takes 1/ρ² times the"
        " records, where ρ is the correlation of instrument and treatment: 4 times as many at 0.5,"
        f" 25 times at 0.2, 100 times at 0.1. {study.terms.records:,} records may be far too few."
    )
    others = [each for each in answer.routes if each.plan and each is not route]
    if others:
        best = min(others, key=lambda each: each.plan.buy.bill.total if each.plan else Fraction(0))
        assert best.plan, "only routes with a plan are compared"
        price = price_of(best.plan.buy.bill.total, study)
        yield f"The best other route is {ROUTES[best.route].words.title}: {price}."


def over_limits(answer: RouteAnswer, effect: Effect, study: Study) -> str:
    """Return what stands in the way of a route, and what would be needed."""
    if answer.status != "over_limits" or not answer.exceeds:
        return sentence(answer.reason, effect, answer.route)
    return f"it would take {'; or '.join(needed(each, study) for each in answer.exceeds)}."


def needed(each: Exceeded, study: Study) -> str:
    """Return what would be needed of a limit, and what is allowed."""
    match each.limit:
        case "budget":
            more, most = price_of(each.needed, study), price_of(each.allowed, study)
            return f"a budget of {more}, where {most} is allowed"
        case "frame_size":
            return f"a frame of {plain(each.needed)} units, where there are {plain(each.allowed)}"
        case "least_reliability":
            return (
                f"readings of reliability {plain(each.needed)}, where {plain(each.allowed)} is the"
                " least allowed"
            )
        case limit:
            name = limit.removeprefix("burdens.")
            label = study.terms.burdens[name].label or name
            most = plain(each.allowed)
            return f"{plain(each.needed)} {label} per {study.unit}, where {most} is allowed"


def price_of(total: Fraction, study: Study) -> str:
    """Return an amount of money with its currency."""
    return f"{money(total)} {study.currency}".strip()


# --------------------------------------------------------------------------------- what is measured


def bought_rows(plan: Plan, route: str, effect: Effect, study: Study) -> Iterable[Bought]:
    """Return a row for each variable that is measured, then for each component."""
    for variable, way in plan.buy.measure.items():
        purchase = study.prices.ways[variable][way]
        reason = plan.needed[variable]
        yield Bought(
            name=variable,
            part=plan.role(variable) or reason.kind,
            way=way,
            how=purchase.label or study.variables[variable].label,
            each=price_each(purchase, study),
            once=money(purchase.setup),
            why=sentence(reason, effect, route),
        )
    for name in plan.buy.bill.components:
        component = study.prices.components[name]
        yield Bought(
            name=name,
            part="component",
            way="",
            how=component.label,
            each=price_each(component, study),
            once=money(component.setup),
            why=component_reason(name, plan.buy, study),
        )


def legend(plan: Plan) -> tuple[str, ...]:
    """Return how to read a path, where there is one that a covariate closes."""
    if all(reason.kind != "closes" for reason in plan.needed.values()):
        return ()
    return (
        "An arrow points from cause to effect. To close a path is to adjust for a variable on it,"
        " so that what it carries is not taken for an effect of the treatment.",
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
        return "is always bought"
    return f"is needed by {conjoined(users)}"


def price_each(purchase: Purchase, study: Study) -> str:
    """Return what each unit costs, its burdens included; a batch beside it."""
    burdens = sum(
        (study.terms.burdens[name].price * taken for name, taken in purchase.takes.items()),
        Fraction(0),
    )
    each = money(purchase.per_unit + burdens)
    if purchase.batch is None:
        return each
    batch = f"{money(purchase.batch.price)} per {purchase.batch.holds}"
    return batch if purchase.per_unit + burdens == 0 else f"{each} + {batch}"


def notes(plan: Plan, effect: Effect, route: str, *, only_never: bool) -> tuple[Note, ...]:
    """Return why variables are left out: those that must not be held, or all the others."""
    return tuple(
        Note(name, sentence(reason, effect, route))
        for name, reason in plan.left_out.items()
        if (name in plan.never) == only_never
    )


# -------------------------------------------------------------------------------- money and burdens


def bill_rows(buy: Buy) -> Iterable[BillRow]:
    """Return the bill, line by line, and its total."""
    for line in buy.bill.lines:
        yield bill_row(line)
    yield BillRow(
        name="total",
        units="",
        setup="",
        per_unit="",
        batches="",
        burdens="",
        amount=money(buy.bill.total),
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
        most = "" if limit is None else f" of at most {plain(limit)}"
        yield Note(
            study.terms.burdens[name].label or name, f"{plain(taken)}{most} per {study.unit}"
        )


def cautions(buy: Buy, study: Study) -> Iterable[str]:
    """Return a caution for everything bought that can hurt someone."""
    burdens = [name for name, taken in buy.bill.burdens.items() if taken]
    risky = [
        study.terms.burdens[name].label or name
        for name in burdens
        if study.terms.burdens[name].care
    ]
    risky += [
        variable
        for variable, way in buy.measure.items()
        if study.variables[variable].care or study.prices.ways[variable][way].care
    ]
    risky += [name for name in buy.bill.components if study.prices.components[name].care]
    for name in risky:
        yield (
            f"{name}: this can hurt someone. Local rules, ethics review and licensed practice"
            " decide whether it is done and how; this plan does not."
        )


# --------------------------------------------------------------------------------------- all routes


STATUS_WORDS = {"feasible": "open", "over_limits": "beyond the limits", "impossible": "closed"}


def route_row(answer: RouteAnswer, effect: Effect, study: Study) -> RouteRow:
    """Return one route beside the others; beyond the limits, with the plan that would do."""
    plan = answer.plan or answer.beyond
    reason = (
        over_limits(answer, effect, study)
        if answer.status == "over_limits"
        else sentence(answer.reason, effect, answer.route)
    )
    return RouteRow(
        name=answer.route,
        status=STATUS_WORDS[answer.status],
        total=price_of(plan.buy.bill.total, study) if plan else "–",
        each=money(plan.buy.bill.next_unit) if plan else "–",
        once=money(plan.buy.bill.setup) if plan else "–",
        variables=str(len(plan.buy.measure)) if plan else "–",
        estimand=estimand(answer.route, study),
        leans_on=leans_on(answer.route, effect),
        reason=reason,
        witnesses=tuple(sentence(each, effect, answer.route) for each in answer.witnesses),
    )


def closing_notes(study: Study, buy: Buy | None) -> Iterable[str]:
    """Return what else a reader should know: losses, errors of reading, what is not worked out."""
    if buy is not None:
        yield losses(study, buy)
        yield read_without_error(study, buy)
    yield (
        f"Whether {counted(study.terms.records, 'record')} are enough is not worked out here: this"
        " is the cheapest plan for that number."
    )
    yield "All planned analyses are linear."
    yield "Everything rests on the diagram: a missing arrow can undo any route."


def losses(study: Study, buy: Buy) -> str:
    """Return what is lost between the units started and the records."""
    if buy.bill.kept == 1:
        return f"No losses are assumed: every {study.unit} that is started gives a usable record."
    return (
        f"To get {counted(buy.bill.records, 'complete record')}, {buy.bill.started:,} are started:"
        f" {percent(buy.bill.kept)} of them are taken to come through and be usable."
    )


def read_without_error(study: Study, buy: Buy) -> str:
    """Return whose readings are taken to carry no error."""
    exact = [
        variable
        for variable, way in buy.measure.items()
        if study.prices.ways[variable][way].reliability == 1
    ]
    return f"Taken as read without error: {conjoined(exact) or 'none'}."

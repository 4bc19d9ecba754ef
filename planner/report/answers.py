"""The sentences of a report: the answer, how sure it is, what warns, what else is good to know."""

from collections.abc import Iterable
from dataclasses import replace
from fractions import Fraction

from costs.bill import bill_for
from planner.plan import Buy, EffectAnswer, Exceeded, Plan, Recommendation, RouteAnswer
from planner.report.numbers import counted, exact, money, percent
from planner.routes import ROUTES
from planner.study import Effect, Study
from planner.words import conjoined, sentence

__all__ = [
    "answer_sentences",
    "beyond_limits",
    "cautions",
    "closing_notes",
    "price_of",
    "same_for_all",
]

CORRELATIONS = (Fraction(1, 2), Fraction(1, 5), Fraction(1, 10))
"""Of instrument and treatment, for which the price of a weak instrument is told."""


def price_of(total: Fraction, study: Study) -> str:
    """Return an amount of money with its currency."""
    return f"{money(total)} {study.currency}".strip()


def answer_sentences(answer: Recommendation, effect_answer: EffectAnswer) -> Iterable[str]:
    """Return the answer in a few sentences: what to do, for how much, and how sure that is."""
    study, effect = answer.study, effect_answer.effect
    if answer.buy is not None and effect_answer.recommended is not None:
        route = effect_answer.answer(effect_answer.recommended)
        assert route.plan, "the recommended route has a plan"
        yield recommendation(study, effect, answer.buy, route.route, route.plan)
        if route.plan.instruments:
            yield weak_instrument(study, answer.buy)
        yield from next_best(study, effect, effect_answer, route)
    elif answer.status == "no_effect":
        yield sentence(effect_answer.routes[0].reason, effect)
    elif same_for_all(effect_answer):
        yield beyond_limits(effect_answer.routes[0], effect, study)
    else:
        yield (
            "No plan stays within the limits."
            if answer.status == "over_limits"
            else "No route leads to this effect with what can be measured."
        )
        for each in effect_answer.routes:
            words = ROUTES[each.route].words.title
            yield f"By {words}: {beyond_limits(each, effect, study)}"


def same_for_all(answer: EffectAnswer) -> bool:
    """Say whether one and the same reason closes every route."""
    reasons = {each.reason for each in answer.routes}
    return len(reasons) == 1 and answer.routes[0].reason.kind in {
        "no_directed_path",
        "selection_after_treatment",
    }


def recommendation(study: Study, effect: Effect, buy: Buy, route: str, plan: Plan) -> str:
    """Return what to do, for how much, and how sure it is that nothing cheaper would do."""
    things = counted(len(buy.measure), "variable")
    records = counted(buy.bill.records, "complete record")
    total = price_of(buy.bill.total, study)
    return (
        f"Measure {things} and {analysis(route, plan, effect)}. To end with {records}, start"
        f" {counted(buy.bill.started, 'unit')}: {total} in all. {proof(study, buy)}"
    )


def analysis(route: str, plan: Plan, effect: Effect) -> str:
    """Return what is done with the readings."""
    words = ROUTES[route].words
    template = words.analysis if plan.covariates else words.bare_analysis
    return template.format(
        covariates=conjoined(plan.covariates),
        instruments=conjoined(plan.instruments),
        mediators=conjoined(plan.mediators),
        treatment=effect.treatment,
        outcome=effect.outcome,
    )


def proof(study: Study, buy: Buy) -> str:
    """Return how sure it is that nothing cheaper would do, and what that does not say."""
    records = counted(buy.bill.records, "record")
    if buy.proved:
        sure = (
            f"Proved: for {records}, by this diagram and these prices, no plan by"
            f" {the_routes(study)}."
        )
    else:
        gap = percent(1 - buy.lower_bound / buy.bill.total)
        sure = (
            f"Not proved: the time ran out. No plan costs less than"
            f" {price_of(buy.lower_bound, study)}, so at most {gap} could still be saved."
        )
    return f"{sure} Whether {records} are enough is not worked out here."


def the_routes(study: Study) -> str:
    """Return by which routes no plan costs less, and which ones the study leaves out."""
    titles = {name: route.words.title for name, route in ROUTES.items()}
    left_out = conjoined(title for name, title in titles.items() if name not in study.routes)
    if not left_out:
        return "any route costs less"
    allowed = " or ".join(titles[name] for name in study.routes)
    return f"{allowed} costs less; the study leaves out {left_out}"


def weak_instrument(study: Study, buy: Buy) -> str:
    """Return what a weak instrument costs, in records and in money.

    Its variance is 1/ρ² times that of a comparison adjusted for the same covariates, ρ being the
    correlation of instrument and treatment given these, where they would do for both.
    """
    records = buy.bill.records
    steps = []
    for correlation in CORRELATIONS:
        more = int(records / correlation**2)
        bill = bill_for(buy.bill.ways, study.prices, replace(study.terms, records=more))
        is_too_many = study.frame_size is not None and bill.started > study.frame_size
        price = "more than the frame holds" if is_too_many else price_of(bill.total, study)
        steps.append(f"{more:,} records ({price}) if ρ is {float(correlation):g}")
    return (
        "BUT MIND: this is the cheapest plan for so many records, not for the same precision. An"
        " instrument needs roughly 1/ρ² times the records of an adjusted comparison, ρ being its"
        " correlation with the treatment (given the same covariates): to say as much as"
        f" {records:,} adjusted records it takes about {conjoined(steps)}."
    )


def next_best(
    study: Study, effect: Effect, answer: EffectAnswer, chosen: RouteAnswer
) -> Iterable[str]:
    """Return the cheapest plan of another route, if there is one."""
    others = [
        (each.plan.buy.bill.total, each.route, each.plan)
        for each in answer.routes
        if each.plan and each is not chosen
    ]
    if others:
        total, route, plan = min(others, key=lambda each: each[0])
        yield (
            f"The best other route, {ROUTES[route].words.title}, would be to"
            f" {analysis(route, plan, effect)}: {price_of(total, study)}."
        )


def beyond_limits(answer: RouteAnswer, effect: Effect, study: Study) -> str:
    """Return why a route is open or not; where a limit is in the way, what would be needed."""
    why = sentence(answer.reason, effect, answer.route, study.unmeasurable)
    if not answer.exceeds:
        return why
    together = " and " if answer.reason.kind == "over_limits_together" else "; or "
    takes = f"It would take {together.join(needed(each, study) for each in answer.exceeds)}."
    return f"{why} {takes}" if answer.reason.kind == "out_of_time" else takes


def needed(each: Exceeded, study: Study) -> str:
    """Return what would be needed of a limit, and what is allowed, both to the last digit."""
    need, most = exact(each.needed), exact(each.allowed)
    # A search that was cut short may have missed a plan that needs less.
    need = need if each.proved else f"at most {need}"
    match each.limit:
        case "budget":
            currency = f" {study.currency}" if study.currency else ""
            return f"a budget of {need}{currency}, where {most}{currency} is allowed"
        case "frame_size":
            return f"a frame of {need} units, where there are {most}"
        case "least_reliability":
            return f"readings of reliability {need}, where {most} is the least allowed"
        case limit:
            name = limit.removeprefix("burdens.")
            label = study.terms.burdens[name].label or name
            return f"{need} {label} per unit, where {most} is allowed"


def cautions(buy: Buy, study: Study) -> Iterable[str]:
    """Return a caution for everything bought that can hurt someone."""
    prices, burdens = study.prices, study.terms.burdens
    risky = [
        burdens[name].label or name
        for name, taken in buy.bill.burdens.items()
        if taken and burdens[name].care
    ]
    risky += [
        variable
        for variable, way in buy.measure.items()
        if study.variables[variable].care or prices.ways[variable][way].care
    ]
    risky += [name for name in buy.bill.components if prices.components[name].care]
    for name in risky:
        yield (
            f"{name}: this can hurt someone. Local rules, ethics review and licensed practice"
            " decide whether it is done and how; this plan does not."
        )


def closing_notes(study: Study, buy: Buy | None) -> Iterable[str]:
    """Return what else a reader should know: losses, errors of reading, the kind of analysis."""
    if buy is not None:
        yield losses(study, buy)
        yield read_without_error(study, buy)
    yield "All planned analyses are linear."


def losses(study: Study, buy: Buy) -> str:
    """Return what is lost between the units started and the records."""
    if buy.bill.kept == 1:
        return f"No losses are assumed: every {study.unit} that is started gives a usable record."
    return (
        f"Of {counted(buy.bill.started, 'unit')} started, {percent(buy.bill.kept)} are taken to"
        " come through and be usable."
    )


def read_without_error(study: Study, buy: Buy) -> str:
    """Return whose readings are taken to carry no error."""
    exact = [
        variable
        for variable, way in buy.measure.items()
        if study.prices.ways[variable][way].reliability == 1
    ]
    return f"Taken as read without error: {conjoined(exact) or 'none'}."

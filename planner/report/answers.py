"""The sentences of a report: the answer, how sure it is, what warns, what else is good to know."""

from collections.abc import Iterable
from dataclasses import replace
from fractions import Fraction

from costs.bill import bill_for
from planner.checking import resting_on_default
from planner.limits import design_effect, limits_of
from planner.plan import Buy, EffectAnswer, Exceeded, Plan, Recommendation, RouteAnswer
from planner.report.achieved import interval, real_price, size_sentences
from planner.report.numbers import (
    at_least,
    counted,
    exact,
    figure,
    percent,
    percent_at_most,
    price_of,
)
from planner.routes import ROUTES
from planner.study import Effect, Study
from planner.words import conjoined, sentence

__all__ = [
    "answer_sentences",
    "beyond_limits",
    "cautions",
    "closing_notes",
    "same_for_all",
]

CORRELATIONS = (Fraction(1, 2), Fraction(1, 5), Fraction(1, 10))
"""Of instrument and treatment, for which the price of a weak instrument is told."""
TIE = Fraction(5, 100)
"""Totals, or widths, no further apart than this share are called a tie."""


def answer_sentences(answer: Recommendation, effect_answer: EffectAnswer) -> Iterable[str]:
    """Return the answer in a few sentences: what to do, for how much, and how sure that is."""
    study, effect = answer.study, effect_answer.effect
    if answer.buy is not None and effect_answer.recommended is not None:
        yield from recommendation(study, effect_answer, answer.buy)
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


# ------------------------------------------------------------------------------ the recommendation


def recommendation(study: Study, answer: EffectAnswer, buy: Buy) -> Iterable[str]:
    """Return what to do, how sure it is that nothing better would do, and what else comes close."""
    assert answer.recommended is not None, "there is a recommendation"
    effect, chosen = answer.effect, answer.answer(answer.recommended)
    plan = chosen.plan
    assert plan is not None, "the recommended route has a plan"
    others = [each for each in answer.routes if each.plan is not None and each is not chosen]
    others.sort(key=lambda each: standing(study, each))
    things = counted(len(buy.measure), "variable")
    yield (
        f"Measure {things} and {analysis(chosen.route, plan, effect)}."
        f" {size_sentences(study, effect, plan)}"
    )
    yield proof(study, buy, plan)
    if plan.precision is None and plan.instruments:
        yield weak_instrument(study, buy)
    if plan.precision is not None and study.size.records is not None:
        yield from not_as_precise(study, plan, others)
    ties = [each for each in others if distance(study, chosen, each) <= TIE]
    for each in ties:
        yield tie(study, effect, chosen, each)
    if others and not ties:
        yield next_best(study, effect, others[0])
    if study.size.spend is None:
        yield from cheaper_beyond(study, effect, answer, plan)


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


def proof(study: Study, buy: Buy, plan: Plan) -> str:
    """Return how sure it is that no study would do better, and by which routes."""
    if not buy.proved:
        return f"Not proved: the time ran out. {gap(study, buy, plan)}"
    known = plan.precision is not None
    basis = "the diagram, its strengths and the prices" if known else "the diagram and the prices"
    titles = {name: route.words.title for name, route in ROUTES.items()}
    left_out = conjoined(title for name, title in titles.items() if name not in study.routes)
    by = " or ".join(titles[name] for name in study.routes) if left_out else "any route"
    asked = any("--route" in change for change in study.changes)
    who = "as you asked, this leaves out" if asked else "the study leaves out"
    but = f"; {who} {left_out}" if left_out else ""
    within = " within the limits" if limits_of(study) or study.tolerance.bias is not None else ""
    proved = f"Proved: if {basis} are right, no"
    if study.size.spend is not None:
        return f"{proved} study by {by}{within} has a narrower interval{but}."
    if study.size.records is not None:
        records = counted(buy.bill.records, "record")
        return f"{proved} plan for {records} by {by}{within} costs less{but}."
    return f"{proved} study by {by}{within} does as much for less{but}."


def gap(study: Study, buy: Buy, plan: Plan) -> str:
    """Return what a search that was cut short may have missed."""
    if study.size.spend is not None:
        if not plan.narrowest:
            return "How much narrower the interval could be is not known."
        return f"No study within the limits has a half-width below {at_least(plan.narrowest)}."
    share = percent_at_most(float(1 - buy.lower_bound / buy.bill.total))
    least = price_of(buy.lower_bound, study.currency)
    return f"No plan costs less than {least}, so at most {share} could still be saved."


# --------------------------------------------------------------------------------- what comes close


def standing(study: Study, answer: RouteAnswer) -> Fraction:
    """Return by what routes are compared: the price, or, where money is given, the width."""
    plan = answer.plan
    assert plan is not None, "routes with a plan are compared"
    if study.size.spend is not None:
        assert plan.precision is not None, "where money is given, precision is known"
        return Fraction(plan.precision.half_width)
    return plan.buy.bill.total


def distance(study: Study, chosen: RouteAnswer, other: RouteAnswer) -> Fraction:
    """Return by what share another route is dearer, or its interval wider."""
    least, more = standing(study, chosen), standing(study, other)
    return more / least - 1 if least else Fraction(more > 0)


def tie(study: Study, effect: Effect, chosen: RouteAnswer, other: RouteAnswer) -> str:
    """Return that another route is as good as the recommended one, and what it would be."""
    assert other.plan is not None, "what ties has a plan"
    known = "prices and strengths are" if other.plan.precision else "prices are"
    apart = percent_at_most(float(distance(study, chosen, other)))
    more = "its interval" if study.size.spend is not None else "its price"
    return (
        f"A TIE with {ROUTES[other.route].words.title}, {outline(study, other.plan)}: {more} is"
        f" only {apart} above, and {known} not known to within 5 %. Choose by what each leans on."
        f" There, {analysis(other.route, other.plan, effect)}. See it whole with --route"
        f" {other.route}."
    )


def next_best(study: Study, effect: Effect, other: RouteAnswer) -> str:
    """Return what the best plan of another route would be."""
    assert other.plan is not None, "there is something to outline"
    return (
        f"The best other route, {ROUTES[other.route].words.title}, takes"
        f" {outline(study, other.plan)}: {analysis(other.route, other.plan, effect)}."
    )


def outline(study: Study, plan: Plan) -> str:
    """Return what a plan costs, on how many records, and what they give where that is no target."""
    price = price_of(plan.buy.bill.total, study.currency)
    size, precision = study.size, plan.precision
    words = price
    if size.records is None:
        words = f"{price} on {counted(plan.buy.bill.records, 'record')}"
    if precision is not None and (size.records is not None or size.spend is not None):
        words = f"{words} for a {interval(study, precision.half_width)}"
    return words


def cheaper_beyond(study: Study, effect: Effect, answer: EffectAnswer, plan: Plan) -> Iterable[str]:
    """Return which routes would cost less than the plan if a limit gave way."""
    for each in answer.routes:
        beyond = each.beyond
        if beyond is not None and beyond.buy.bill.total < plan.buy.bill.total:
            price = price_of(beyond.buy.bill.total, study.currency)
            yield (
                f"Beyond the limits, {ROUTES[each.route].words.title} would cost less, {price}."
                f" {beyond_limits(each, effect, study)}"
            )


# ------------------------------------------------------------- what the same precision would cost


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
        price = "more than the frame holds" if is_too_many else price_of(bill.total, study.currency)
        steps.append(f"{more:,} records ({price}) if ρ is {float(correlation):g}")
    return (
        "BUT MIND: this is the cheapest plan for so many records, not for the same precision. An"
        " instrument needs roughly 1/ρ² times the records of an adjusted comparison, ρ being its"
        " correlation with the treatment (given the same covariates): to say as much as"
        f" {records:,} adjusted records it takes about {conjoined(steps)}."
    )


def not_as_precise(study: Study, plan: Plan, others: Iterable[RouteAnswer]) -> Iterable[str]:
    """Return what the plan would cost with the precision of another route, if that is cheaper so.

    On a given number of records the cheapest set is often the one that says least.
    """
    for other in others:
        assert other.plan is not None, "routes with a plan are compared"
        assert other.plan.precision is not None, "precision is known for all routes"
        real = real_price(study, plan, other.plan)
        total = other.plan.buy.bill.total
        if real is not None and real.total <= total:
            continue
        if real is None:
            what = "no number of records would do"
        elif study.frame_size is not None and real.started > study.frame_size:
            what = f"it would take {real.records:,} records, more than the frame holds"
        else:
            price = price_of(real.total, study.currency)
            what = f"it would take {real.records:,} records and {price}"
        yield (
            "BUT MIND: this is the cheapest plan for so many records, not for the same precision."
            f" To say as much as the plan by {ROUTES[other.route].words.title} does for"
            f" {price_of(total, study.currency)} (a"
            f" {interval(study, other.plan.precision.half_width)}), {what}."
        )
        return


# ------------------------------------------------------------------------------- beyond the limits


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
        case "bias" | "first_stage_F":
            return needed_as_computed(each)
        case "records":
            return f"{need} records, where the study has {most}"
        case limit:
            name = limit.removeprefix("burdens.")
            label = study.terms.burdens[name].label or name
            return f"{need} {label} per unit, where {most} is allowed"


def needed_as_computed(each: Exceeded) -> str:
    """Return what would be needed of a limit on a computed number."""
    if each.limit == "bias":
        # Rounded up: what is allowed has to be no less.
        need = percent_at_most(float(each.needed), places=2)
        need = need if each.proved else f"at most {need}"
        return f"a bias bound of {need}, where {exact(100 * each.allowed)} % is allowed"
    reached = at_least(float(each.needed))
    reached = reached if each.proved else f"at least {reached}"
    return f"a first-stage F of {reached}, where {exact(each.allowed)} is the least allowed"


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


def closing_notes(study: Study, route: str, plan: Plan | None, buy: Buy | None) -> Iterable[str]:
    """Return what else a reader should know: losses, clusters, strengths and readings assumed."""
    if buy is not None:
        yield losses(study, buy)
    if plan is not None and plan.precision is not None:
        clustered = design_effect(study, route)
        if clustered != 1:
            yield f"Clusters: on this route they multiply the variance by {figure(clustered)}."
        yield from resting_on_default(study)
    if buy is not None:
        yield read_without_error(study, buy)


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

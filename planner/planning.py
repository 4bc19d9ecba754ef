"""From a study to its recommendation: claims, searches, limits and reasons."""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from fractions import Fraction
from math import isclose

from costs.faults import Fault, FaultyInput, Spot
from costs.prices import shown_name
from costs.tally import Overflow
from planner.claims import Claim
from planner.deadline import Deadline, Tell, tell_nobody
from planner.diagram import Diagram
from planner.findings import Finding, Reason, reason_of
from planner.limits import demand_of, exceeded, limits_of, within_limits
from planner.linear import diagram_of
from planner.plan import (
    Buy,
    EffectAnswer,
    Exceeded,
    Plan,
    Recommendation,
    RouteAnswer,
    StudyStatus,
)
from planner.precision import FORGIVEN, Demand
from planner.program import Choice, NothingFound
from planner.routes import ROUTES
from planner.search import Answer, cheapest
from planner.study import Effect, Study

__all__ = ["NEVER", "recommend", "tell_nobody"]

NEVER = frozenset(
    {"on_causal_path", "below_causal_path", "after_treatment", "carried", "opens", "cuts_link"}
)
"""Kinds of reasons that forbid to condition on a variable."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Question:
    """One effect of a study, and what is the same for all its routes."""

    study: Study
    effect: Effect
    diagram: Diagram
    demand: Demand | None
    """What is demanded of the estimate; None where precision cannot be worked out."""
    seconds: float
    report: Tell

    def telling(self, what: str) -> Tell:
        """Say what is worked on, and return how to say how far it has come."""
        self.report(what)
        return lambda progress: self.report(f"{what}: {progress}")

    def claim(self, route: str) -> Claim:
        """Return the claim that a route leads to the effect."""
        return Claim.of(
            route, self.diagram, self.effect.treatment, self.effect.outcome, self.study.selected_by
        )


def recommend(study: Study, *, seconds: float = 60.0, report: Tell = tell_nobody) -> Recommendation:
    """Return the cheapest plan of a study, with proof and reasons, and what every route would take.

    Parameters
    ----------
    study
        As ``read_study`` returns it.
    seconds
        The time for each route; a search that needs more answers with the best plan so far, and
        says so.
    report
        Is told what is being worked on.

    Raises
    ------
    FaultyInput
        If the amounts of money are too large to be added up exactly.
    """
    try:
        (effect,) = study.effects
        question = Question(
            study=study,
            effect=effect,
            diagram=diagram_of(study),
            demand=demand_of(study, effect),
            seconds=seconds,
            report=report,
        )
        answer, buy = effect_answer(question)
    except Overflow as overflow:
        raise FaultyInput([overflow_fault(study, overflow)]) from overflow
    return Recommendation(
        study=study,
        status=study_status(answer),
        buy=buy,
        effects=(answer,),
    )


def overflow_fault(study: Study, overflow: Overflow) -> Fault:
    """Word amounts that cannot be counted."""
    name = overflow.name
    return Fault(
        file=study.path,
        spot=Spot(1),
        key="size" if name is None else shown_name(name),
        wrong=f"{overflow}",
        mend="Lower its price or the number of records, or count in a larger unit of money.",
    )


def study_status(answer: EffectAnswer) -> StudyStatus:
    """Return the status of the whole study."""
    if answer.recommended is not None:
        return "recommended"
    if any(each.reason.kind == "no_directed_path" for each in answer.routes):
        return "no_effect"
    statuses = {each.status for each in answer.routes}
    return "over_limits" if "over_limits" in statuses else "impossible"


def effect_answer(question: Question) -> tuple[EffectAnswer, Buy | None]:
    """Return what can be said of an effect, and the purchase that is recommended for it.

    One program with the choice of the route in it finds the recommendation; the other routes are
    then searched one by one, for comparison.
    """
    claims = [question.claim(route) for route in question.study.routes]
    closed = {claim.route: closed_route(question, claim) for claim in claims}
    open_claims = tuple(claim for claim in claims if closed[claim.route] is None)
    tell = question.telling("all routes")
    best: Answer | NothingFound = NothingFound(proved=True)
    if open_claims:
        within = within_limits(question.study, demand=question.demand)
        best = cheapest([Choice(open_claims)], within, Deadline(question.seconds), tell)
    routes = tuple(closed[claim.route] or open_route(question, claim, best) for claim in claims)
    plans = {each.route: each.plan for each in routes if each.plan is not None}
    recommended = min(plans, key=lambda route: preference(plans[route]), default=None)
    if isinstance(best, Answer) and best.proved:
        recommended = best.opened[0][0].route
        least = min(preference(plan)[0] for plan in plans.values())
        assert isclose(least, worth(best), rel_tol=FORGIVEN), "no route alone beats all of them"
    buy = None
    if recommended is not None:
        buy = plans[recommended].buy
        bound = overall_bound(best, routes)
        buy = replace(buy, lower_bound=min(bound, buy.bill.total))
    return EffectAnswer(effect=question.effect, recommended=recommended, routes=routes), buy


def preference(plan: Plan) -> tuple[float | Fraction, Fraction, int, list[str]]:
    """Return what decides between two plans.

    Money, or the half-width that the money buys; then money, fewer variables, smaller names.
    """
    buy = plan.buy
    first: float | Fraction = buy.bill.total
    if plan.narrowest is not None and plan.precision is not None:
        first = plan.precision.half_width
    return first, buy.bill.total, len(buy.measure), sorted(buy.measure)


def worth(answer: Answer) -> float | Fraction:
    """Return what decides between two answers first: see ``preference``."""
    if answer.narrowest is not None and answer.precision is not None:
        return answer.precision.half_width
    return answer.bill.total


def overall_bound(best: Answer | NothingFound, routes: Iterable[RouteAnswer]) -> Fraction:
    """Return what no plan of any route costs less than."""
    together = best.lower_bound if isinstance(best, Answer) else best.bound
    unsettled = any(each.reason.kind == "out_of_time" for each in routes)
    bounds = [each.plan.buy.lower_bound for each in routes if each.plan is not None]
    return together if unsettled else max(together, min(bounds))


def closed_route(question: Question, claim: Claim) -> RouteAnswer | None:
    """Return why a route cannot be taken, whatever is bought; None if it is open.

    This takes no search: each criterion knows roles that open its route if any do.
    """
    reasons = closing_reasons(question, claim)
    if not reasons:
        return None
    return RouteAnswer(
        route=claim.route, status="impossible", reason=reasons[0], witnesses=tuple(reasons[1:])
    )


def closing_reasons(question: Question, claim: Claim) -> list[Reason]:
    """Return why a route cannot be taken, and what shows it; nothing if it is open."""
    diagram = claim.diagram
    if claim.is_about_nothing:
        return [Reason("no_directed_path")]
    late = diagram.by_name(claim.selected & claim.after)
    if late:
        path = diagram.directed_path(claim.treatment, {late[0]})
        assert path, "what comes after the treatment follows from it"
        return [reason_of(diagram, Finding("selection_after_treatment", path, tuple(late)))]
    measurable = diagram.nodes(question.study.prices.ways)
    route = ROUTES[claim.route]
    if route.criterion.opening(claim, measurable) is not None:
        return []
    return [reason_of(diagram, each) for each in route.reasons.hindrances(claim, measurable)]


def open_route(question: Question, claim: Claim, best: Answer | NothingFound) -> RouteAnswer:
    """Return the cheapest plan of a route, or what is in its way.

    Parameters
    ----------
    best
        What the search over all routes gave: the answer of this route, if it was the one opened;
        and if nothing fits at all, nothing fits here.
    """
    deadline = Deadline(question.seconds)
    own = best if isinstance(best, Answer) and best.opened[0][0] is claim else None
    answer: Answer | NothingFound = best
    if not best.proved or (own is None and isinstance(best, Answer)):
        tell = question.telling(ROUTES[claim.route].words.title)
        answer = better(own, search(question, claim, deadline, tell))
    if isinstance(answer, NothingFound):
        return route_beyond_limits(question, claim, deadline, settled=answer.proved)
    return feasible_route(question, claim, answer)


def better(one: Answer | None, other: Answer | NothingFound) -> Answer | NothingFound:
    """Return the cheaper of two answers to the same question, with the higher of their bounds."""
    if one is None or isinstance(other, NothingFound):
        return one or other
    best = min(one, other, key=worth)
    bound = max(one.lower_bound, other.lower_bound)
    narrowest = None
    if one.narrowest is not None and other.narrowest is not None:
        narrowest = max(one.narrowest, other.narrowest)
    return replace(best, lower_bound=min(bound, best.bill.total), narrowest=narrowest)


def feasible_route(question: Question, claim: Claim, answer: Answer) -> RouteAnswer:
    """Return a route with its plan."""
    ((_, roles),) = answer.opened
    opened = ROUTES[claim.route].reasons.opened(claim, roles)
    return RouteAnswer(
        route=claim.route,
        status="feasible",
        reason=reason_of(claim.diagram, opened),
        plan=plan_of(question, answer),
    )


def search(
    question: Question, claim: Claim, deadline: Deadline, tell: Tell, lifted: Iterable[str] = ()
) -> Answer | NothingFound:
    """Return the cheapest purchase for one claim, some limits lifted."""
    within = within_limits(question.study, lifted, question.demand, claim.route)
    return cheapest([Choice((claim,))], within, deadline, tell)


def route_beyond_limits(
    question: Question, claim: Claim, deadline: Deadline, *, settled: bool
) -> RouteAnswer:
    """Return what an open route would take, when no plan within the limits was found.

    Every limit is lifted alone, and the cheapest of the plans that this gives is shown; where none
    helps by itself, the cheapest plan without any limit, and what it breaks.

    Parameters
    ----------
    settled
        Whether it is sure that there is no plan within the limits.
    """
    tell = question.telling(f"{ROUTES[claim.route].words.title}, beyond the limits")
    study, demand = question.study, question.demand
    limits = limits_of(study, demand, claim.route)
    alone = [search(question, claim, deadline, tell, [limit]) for limit in limits]
    helping = [found for found in alone if isinstance(found, Answer)]
    for found in helping:
        if not exceeded(study, found, demand, claim.route):
            # The first search was cut short, and this one, with more room, met a plan within.
            return feasible_route(question, claim, found)
    together = not helping
    if together:
        unlimited = search(question, claim, deadline, tell, limits)
        if isinstance(unlimited, NothingFound):
            return route_out_of_reach(claim, proved=settled and unlimited.proved)
        helping = [unlimited]
    exceeds = [each for found in helping for each in exceeded(study, found, demand, claim.route)]
    plans = [plan_of(question, found) for found in helping]
    kind = "over_limits_together" if together and len(exceeds) > 1 else "over_limits"
    return RouteAnswer(
        route=claim.route,
        status="over_limits",
        reason=reason_beyond(kind if settled else "out_of_time", exceeds),
        beyond=min(plans, key=preference),
        exceeds=tuple(exceeds),
    )


def route_out_of_reach(claim: Claim, *, proved: bool) -> RouteAnswer:
    """Return a route that is open, but on which no number of records shows the effect."""
    if proved:
        return RouteAnswer(route=claim.route, status="impossible", reason=Reason("out_of_reach"))
    return RouteAnswer(route=claim.route, status="over_limits", reason=Reason("out_of_time"))


def reason_beyond(kind: str, exceeds: Iterable[Exceeded]) -> Reason:
    """Return which limits are in the way."""
    return Reason(kind, variables=tuple(each.limit for each in exceeds))


def plan_of(question: Question, answer: Answer) -> Plan:
    """Return the plan that an answer amounts to, with its reasons."""
    ((claim, roles),) = answer.opened
    diagram, route = claim.diagram, ROUTES[claim.route]
    needed = {
        diagram.names[claim.treatment]: Reason("treatment"),
        diagram.names[claim.outcome]: Reason("outcome"),
    }
    for node in diagram.by_name(roles.nodes):
        name = diagram.names[node]
        if name in answer.extras:
            is_cheaper = answer.extras[name] is not None
            needed[name] = Reason("saves" if is_cheaper else "keeps_limits", variables=(name,))
        else:
            needed[name] = reason_of(diagram, route.reasons.needed(claim, roles, node))
    others = [
        node
        for node in diagram.by_name(diagram.nodes(question.study.prices.ways))
        if diagram.names[node] not in needed
    ]
    found = route.reasons.left_out(claim, roles, [n for n in others if n not in claim.selected])
    left_out = {
        diagram.names[node]: reason_of(diagram, found.get(node, Finding("selected", (), (node,))))
        for node in others
    }
    return Plan(
        covariates=diagram.named(diagram.by_name(roles.covariates)),
        instruments=diagram.named(diagram.by_name(roles.instruments)),
        mediators=diagram.named(diagram.by_name(roles.mediators)),
        buy=Buy(
            measure=dict(answer.bill.ways),
            bill=answer.bill,
            lower_bound=answer.lower_bound,
        ),
        precision=answer.precision,
        extras=answer.extras,
        narrowest=answer.narrowest,
        needed=needed,
        left_out=left_out,
        never=tuple(name for name, reason in left_out.items() if reason.kind in NEVER),
    )

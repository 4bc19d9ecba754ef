"""From a study to its recommendation: claims, searches, limits and reasons.

``cheapest`` is the one entry to the search; nothing above it asks how an answer was found, and no
answer leaves it that has not passed the plain check of its route and the limits of its bill.
"""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from costs.bill import Bill, bill_for
from costs.faults import Fault, FaultyInput, Spot
from costs.prices import PriceList, Way, WayName
from costs.tally import Overflow
from planner.claims import Claim, Finding, Roles
from planner.diagram import Diagram
from planner.findings import Reason, reason_of
from planner.plan import Buy, EffectAnswer, Exceeded, Plan, Recommendation, RouteAnswer
from planner.program import Choice, Found, NothingFound, Within, cheapest_purchase
from planner.routes import ROUTES
from planner.study import Effect, Study

__all__ = ["Answer", "cheapest", "diagram_of", "limits_of", "recommend", "within_limits"]

NEVER = frozenset(
    {"on_causal_path", "below_causal_path", "after_treatment", "carried", "opens", "cuts_link"}
)
"""Kinds of reasons that forbid to condition on a variable."""

Report = Callable[[str], None]
"""Is told what is being worked on."""


def tell_nobody(_: str) -> None:
    """Tell nobody what is being worked on."""


def diagram_of(study: Study) -> Diagram:
    """Return the study's diagram, hidden common causes as nodes of their own."""
    causes: dict[str, list[str]] = {
        name: list(variable.causes) for name, variable in study.variables.items()
    }
    for hidden in study.hidden_causes:
        for name in hidden.of:
            causes[name].append(hidden.name)
    return Diagram.of(causes | {hidden.name: [] for hidden in study.hidden_causes})


# --------------------------------------------------------------------------------------- the search


@dataclass(frozen=True, kw_only=True, slots=True)
class Answer:
    """The cheapest purchase for some claims, and who plays which part in each."""

    measure: tuple[WayName, ...]
    bill: Bill
    lower_bound: Fraction
    """Nothing within the limits costs less."""
    proved: bool
    """Whether the bill comes to no more than that."""
    opened: tuple[tuple[Claim, Roles], ...]
    """The claim that each choice opens, with its roles."""


def cheapest(choices: Sequence[Choice], within: Within, seconds: float) -> Answer | NothingFound:
    """Return the cheapest purchase with which one claim of each choice comes true.

    Parameters
    ----------
    choices
        Each a list of claims, of which one has to come true; all choices share the purchases.
    within
        Prices, terms and limits.
    seconds
        The time that the search may take.
    """
    found = cheapest_purchase(
        choices,
        within,
        lambda program, claim, measurable, opens: ROUTES[claim.route].rows.write_rows(
            program, claim, measurable, opens
        ),
        seconds,
    )
    if isinstance(found, NothingFound):
        return found
    opened = tuple((claim, settled(claim, roles)) for claim, roles in found.opened)
    bill = bill_for(wanted_ways(found, opened), within.prices, within.terms)
    for claim, roles in opened:
        assert ROUTES[claim.route].is_valid(claim, roles), "the plain check agrees with the program"
    assert not within.broken(bill), "the bill keeps the limits that the program was given"
    assert bill.total <= found.bill.total, "what is dropped saves money"
    return Answer(
        measure=bill.ways,
        bill=bill,
        lower_bound=min(found.bound, bill.total),
        proved=found.proved,
        opened=opened,
    )


def settled(claim: Claim, roles: Roles) -> Roles:
    """Return the roles without anyone who is not needed, the instrument of the smallest name first.

    A proved answer holds nobody who is not needed, since fewer variables win a tie; one that the
    time cut short may. Which of two candidates is called the instrument must not hang on the
    solver.
    """
    route = ROUTES[claim.route]
    for node in reversed(claim.diagram.by_name(roles.everyone)):
        if route.is_valid(claim, roles.without(node)):
            roles = roles.without(node)
    if roles.instruments:
        for node in claim.diagram.by_name(roles.everyone):
            others = roles.everyone - {node}
            turned = Roles(instruments=frozenset((node,)), covariates=others)
            if route.is_valid(claim, turned):
                return turned
    return roles


def wanted_ways(found: Found, opened: Iterable[tuple[Claim, Roles]]) -> list[WayName]:
    """Return the ways of those who play a part, treatments and outcomes first."""
    ends: list[str] = []
    others: set[str] = set()
    for claim, roles in opened:
        ends += claim.diagram.named((claim.treatment, claim.outcome))
        others |= set(claim.diagram.named(roles.everyone))
    chosen = dict(found.bill.ways)
    order = dict.fromkeys([*ends, *sorted(others)])
    return [(variable, chosen[variable]) for variable in order]


# --------------------------------------------------------------------------------------- the limits


def limits_of(study: Study) -> dict[str, Fraction]:
    """Return every limit of a study by its name."""
    limits = {
        "budget": study.budget,
        "frame_size": None if study.frame_size is None else Fraction(study.frame_size),
        "least_reliability": study.tolerance.least_reliability,
        **{f"burdens.{name}": burden.limit for name, burden in study.terms.burdens.items()},
    }
    return {name: limit for name, limit in limits.items() if limit is not None}


def within_limits(study: Study, lifted: Iterable[str] = ()) -> Within:
    """Return what a plan has to stay within, some limits lifted."""
    limits = limits_of(study)
    for name in lifted:
        del limits[name]
    least = limits.get("least_reliability", Fraction(0))
    burdens = {
        name: replace(burden, limit=limits.get(f"burdens.{name}"))
        for name, burden in study.terms.burdens.items()
    }
    frame = limits.get("frame_size")
    return Within(
        prices=reliable(study.prices, least),
        terms=replace(study.terms, burdens=burdens),
        budget=limits.get("budget"),
        frame_size=None if frame is None else int(frame),
    )


def reliable(prices: PriceList, least: Fraction) -> PriceList:
    """Return the price list without ways below a reliability."""

    def kept(ways: Iterable[tuple[str, Way]]) -> dict[str, Way]:
        return {name: way for name, way in ways if way.reliability >= least}

    ways = {variable: kept(named.items()) for variable, named in prices.ways.items()}
    return replace(prices, ways={variable: named for variable, named in ways.items() if named})


def needed_of(limit: str, answer: Answer, prices: PriceList) -> Fraction:
    """Return what an answer needs of a limit."""
    bill = answer.bill
    match limit:
        case "budget":
            return bill.total
        case "frame_size":
            return Fraction(bill.started)
        case "least_reliability":
            return min(prices.ways[variable][way].reliability for variable, way in bill.ways)
        case _:
            return bill.burdens[limit.removeprefix("burdens.")]


def exceeded(limits: dict[str, Fraction], answer: Answer, prices: PriceList) -> list[Exceeded]:
    """Return the limits that an answer breaks."""
    found = []
    for limit, allowed in limits.items():
        needed = needed_of(limit, answer, prices)
        if needed < allowed if limit == "least_reliability" else needed > allowed:
            found.append(Exceeded(limit, allowed, needed))
    return found


# --------------------------------------------------------------------------------------- the answer


@dataclass(frozen=True, kw_only=True, slots=True)
class Question:
    """One effect of a study, and what is the same for all its routes."""

    study: Study
    effect: Effect
    diagram: Diagram
    seconds: float
    report: Report

    def claim(self, route: str) -> Claim:
        """Return the claim that a route leads to the effect."""
        return Claim.of(
            route, self.diagram, self.effect.treatment, self.effect.outcome, self.study.selected_by
        )


def recommend(
    study: Study, *, seconds: float = 60.0, report: Report = tell_nobody
) -> Recommendation:
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
            seconds=seconds,
            report=report,
        )
        answer, buy = effect_answer(question)
    except Overflow as overflow:
        raise FaultyInput([overflow_fault(study, overflow)]) from overflow
    return Recommendation(
        study=study,
        status=study_status(answer, question),
        buy=buy,
        effects=(answer,),
    )


def overflow_fault(study: Study, overflow: Overflow) -> Fault:
    """Word amounts that cannot be counted."""
    return Fault(
        file=study.path,
        spot=Spot(1),
        key=overflow.name or "size",
        wrong=f"is too dear to be added up exactly: {overflow}",
        mend="Lower its price or the number of records, or count in a larger unit of money.",
    )


def study_status(answer: EffectAnswer, question: Question) -> str:
    """Return the status of the whole study."""
    if answer.recommended is not None:
        return "recommended"
    if question.claim(next(iter(ROUTES))).is_about_nothing:
        return "no_effect"
    statuses = {each.status for each in answer.routes}
    return "over_limits" if "over_limits" in statuses else "impossible"


def effect_answer(question: Question) -> tuple[EffectAnswer, Buy | None]:
    """Return what can be said of an effect, and the purchase that is recommended for it.

    One program with the choice of the route in it finds the recommendation; the other routes are
    then searched one by one, for comparison.
    """
    claims = [question.claim(route) for route in question.study.routes]
    open_claims = tuple(claim for claim in claims if settling_reason(claim) is None)
    question.report("the cheapest of all routes")
    best: Answer | NothingFound = NothingFound(proved=True)
    if open_claims:
        within = within_limits(question.study)
        best = cheapest([Choice(open_claims)], within, question.seconds * len(open_claims))
    routes = tuple(route_answer(question, claim, best) for claim in claims)
    plans = {each.route: each.plan for each in routes if each.plan is not None}
    recommended = min(plans, key=lambda route: preference(plans[route].buy), default=None)
    if isinstance(best, Answer) and best.proved:
        assert recommended == best.opened[0][0].route, "no single search beats the one over all"
    buy = None
    if recommended is not None:
        bound = overall_bound(best, routes)
        buy = plans[recommended].buy
        buy = replace(buy, lower_bound=min(bound, buy.bill.total), proved=bound >= buy.bill.total)
    return EffectAnswer(effect=question.effect, recommended=recommended, routes=routes), buy


def preference(buy: Buy) -> tuple[Fraction, int, list[str]]:
    """Return what decides between two plans: money, then fewer variables, then smaller names."""
    return buy.bill.total, len(buy.measure), sorted(buy.measure)


def overall_bound(best: Answer | NothingFound, routes: Iterable[RouteAnswer]) -> Fraction:
    """Return what no plan of any route costs less than."""
    if isinstance(best, Answer) and best.proved:
        return best.lower_bound
    unsettled = any(each.reason.kind == "out_of_time" for each in routes)
    bounds = [each.plan.buy.lower_bound for each in routes if each.plan is not None]
    single = Fraction(0) if unsettled or not bounds else min(bounds)
    return max(single, best.lower_bound) if isinstance(best, Answer) else single


def settling_reason(claim: Claim) -> Reason | None:
    """Return why no route at all leads to the effect, if so."""
    if claim.is_about_nothing:
        return Reason("no_directed_path")
    late = claim.diagram.by_name(claim.selected & claim.after)
    if late:
        path = claim.diagram.directed_path(claim.treatment, {late[0]})
        assert path, "what comes after the treatment follows from it"
        return reason_of(claim.diagram, Finding("selection_after_treatment", path, tuple(late)))
    return None


def route_answer(question: Question, claim: Claim, best: Answer | NothingFound) -> RouteAnswer:
    """Return what can be said of one route.

    Parameters
    ----------
    best
        What the search over all routes gave: the answer of this route, if it was the one opened,
        and if nothing fits at all, nothing fits here.
    """
    reason = settling_reason(claim)
    if reason is not None:
        return RouteAnswer(route=claim.route, status="impossible", reason=reason)
    answer = best
    if (isinstance(best, Answer) and best.opened[0][0] is not claim) or not best.proved:
        question.report(ROUTES[claim.route].words.title)
        answer = search(question, claim)
    if isinstance(answer, NothingFound):
        return closed_route(question, claim, settled=answer.proved)
    return RouteAnswer(
        route=claim.route,
        status="feasible",
        reason=reason_of(
            claim.diagram, ROUTES[claim.route].reasons.opened(claim, answer.opened[0][1])
        ),
        plan=plan_of(question, answer),
    )


def search(question: Question, claim: Claim, lifted: Iterable[str] = ()) -> Answer | NothingFound:
    """Return the cheapest purchase for one claim, some limits lifted."""
    within = within_limits(question.study, lifted)
    return cheapest([Choice((claim,))], within, question.seconds)


def closed_route(question: Question, claim: Claim, *, settled: bool) -> RouteAnswer:
    """Return what can be said of a route for which no plan within the limits was found.

    Every limit is lifted alone, and the cheapest of the plans that this gives is shown; where none
    helps by itself, the cheapest plan without any limit, and what it breaks.
    """
    limits = limits_of(question.study)
    question.report(f"{ROUTES[claim.route].words.title}, beyond the limits")
    unlimited = search(question, claim, limits)
    if isinstance(unlimited, NothingFound) and unlimited.proved:
        return impossible_route(question, claim)
    alone = {limit: search(question, claim, [limit]) for limit in limits}
    helping = {limit: found for limit, found in alone.items() if isinstance(found, Answer)}
    prices = question.study.prices
    exceeds = [
        Exceeded(limit, limits[limit], needed_of(limit, found, prices))
        for limit, found in helping.items()
    ]
    plans = [plan_of(question, found) for found in helping.values()]
    kind = "over_limits" if settled else "out_of_time"
    if not plans and isinstance(unlimited, Answer):
        exceeds = exceeded(limits, unlimited, prices)
        plans = [plan_of(question, unlimited)]
        kind = "over_limits_together" if settled else "out_of_time"
    return RouteAnswer(
        route=claim.route,
        status="over_limits",
        reason=Reason(kind, variables=tuple(each.limit for each in exceeds)),
        beyond=min(plans, key=lambda plan: preference(plan.buy), default=None),
        exceeds=tuple(exceeds),
    )


def impossible_route(question: Question, claim: Claim) -> RouteAnswer:
    """Return an impossible route with what stands in its way."""
    measurable = claim.diagram.nodes(question.study.prices.ways)
    findings = ROUTES[claim.route].reasons.hindrances(claim, measurable)
    assert findings, "a route that cannot be taken is hindered by something"
    reason, *witnesses = (reason_of(claim.diagram, finding) for finding in findings)
    return RouteAnswer(
        route=claim.route, status="impossible", reason=reason, witnesses=tuple(witnesses)
    )


def plan_of(question: Question, answer: Answer) -> Plan:
    """Return the plan that an answer amounts to, with its reasons."""
    ((claim, roles),) = answer.opened
    diagram, route = claim.diagram, ROUTES[claim.route]
    needed = {
        diagram.names[claim.treatment]: Reason("treatment"),
        diagram.names[claim.outcome]: Reason("outcome"),
    }
    for node in diagram.by_name(roles.everyone):
        needed[diagram.names[node]] = reason_of(diagram, route.reasons.needed(claim, roles, node))
    left_out = {
        diagram.names[node]: reason_of(diagram, left_out_finding(claim, roles, node))
        for node in diagram.by_name(diagram.nodes(question.study.prices.ways))
        if diagram.names[node] not in needed
    }
    return Plan(
        covariates=diagram.named(diagram.by_name(roles.covariates)),
        instruments=diagram.named(diagram.by_name(roles.instruments)),
        mediators=diagram.named(diagram.by_name(roles.mediators)),
        buy=Buy(
            measure=dict(answer.measure),
            bill=answer.bill,
            lower_bound=answer.lower_bound,
            proved=answer.proved,
        ),
        needed=needed,
        left_out=left_out,
        never=tuple(name for name, reason in left_out.items() if reason.kind in NEVER),
    )


def left_out_finding(claim: Claim, roles: Roles, node: int) -> Finding:
    """Say why a measurable variable is not measured."""
    if node in claim.selected:
        return Finding("selected", (), (node,))
    return ROUTES[claim.route].reasons.left_out(claim, roles, node)

"""Those measured whom validity does not need: what each is there for."""

from collections.abc import Iterable

from planner.limits import demand_of
from planner.plan import Plan
from planner.precision import FORGIVEN, Demand, Parts, bias_of
from planner.report.numbers import exact, percent_at_most, price_of
from planner.routes import ROUTES
from planner.study import Effect, Study

__all__ = ["worth_of_extra"]

NEEDLESS = "not needed for validity"


def worth_of_extra(name: str, plan: Plan, route: str, effect: Effect, study: Study) -> str:
    """Return what an extra variable is there for: what it saves, or the limit it keeps."""
    saves = plan.extras[name]
    if saves is not None and saves > 0:
        more = price_of(saves, study.currency)
        return f"{NEEDLESS}; without it the same precision would cost {more} more"
    broken = broken_without(name, plan, route, effect, study)
    if broken:
        return f"{NEEDLESS}; without it, {broken}"
    if saves is None:
        return f"{NEEDLESS}; without it, it would take more records than the limits allow"
    # Only where the time ran out before the variable could be dropped.
    return f"{NEEDLESS}, and it may be that it saves nothing"


def broken_without(name: str, plan: Plan, route: str, effect: Effect, study: Study) -> str:
    """Return how the limit of bias would break without a variable; empty if it would not."""
    demand = demand_of(study, effect)
    assert demand is not None, "with extras, precision is known"
    bias = bias_without(name, plan, route, effect, study, demand)
    if study.tolerance.bias is not None and bias > demand.bias * (1 + FORGIVEN):
        allowed = exact(100 * study.tolerance.bias)
        return (
            f"errors in the other readings could put the estimate off by {percent_at_most(bias)}"
            f" of the effect, where {allowed} % is allowed"
        )
    return ""


def bias_without(
    name: str, plan: Plan, route: str, effect: Effect, study: Study, demand: Demand
) -> float:
    """Return the bias bound of a plan without a variable."""

    def rows(names: Iterable[str]) -> tuple[int, ...]:
        return tuple(demand.rows[each] for each in names if each != name)

    parts = Parts(
        x=demand.rows[effect.treatment],
        y=demand.rows[effect.outcome],
        w=rows(plan.covariates),
        z=rows(plan.instruments),
        m=rows(plan.mediators),
    )
    ways = {each: study.prices.ways[each][way] for each, way in plan.buy.measure.items()}
    noise = {demand.rows[each]: float(1 / way.reliability) - 1 for each, way in ways.items()}
    bound, _ = bias_of(ROUTES[route].precision, demand.sigma, parts, noise, demand.effect)
    return float(bound)

"""The limits of a study: by name, lifted, and what an answer needs of them."""

from collections.abc import Iterable, Mapping
from dataclasses import replace
from fractions import Fraction
from math import inf
from statistics import NormalDist

from costs.prices import PriceList, Way
from planner.linear import is_learnable, linear_model, units_per_unit
from planner.plan import Exceeded
from planner.precision import FORGIVEN, ROUNDING, Demand, covariance
from planner.program import Within
from planner.search import Answer
from planner.study import ClusterDesign, Effect, Study

__all__ = ["demand_of", "exceeded", "limits_of", "within_limits"]


ANY_WIDTH = 1e-9
"""A K that asks for nothing."""
MOST_MODELLED = 400
"""Variables up to which precision is worked out where the number of records is given."""


def demand_of(study: Study, effect: Effect) -> Demand | None:
    """Return what is demanded of the estimate; None where precision cannot be worked out.

    That is where a strength that matters is missing, or where the effect is zero: by the diagram,
    or because its paths cancel.
    """
    model = linear_model(study, effect) if is_learnable(study, effect) else None
    if model is None or not model.effect:
        return None
    if not study.size.is_target and len(model.names) > MOST_MODELLED:
        return None
    size, scale = study.size, units_per_unit(study, effect)
    z = NormalDist().inv_cdf((1 + size.confidence) / 2)
    reach = None
    if size.half_width is not None:
        reach = z * scale / size.half_width
    elif size.implied or size.detect is not None:
        reach = (z + NormalDist().inv_cdf(size.power)) / abs(model.effect)
    return Demand(
        sigma=covariance(model, study.selected_by),
        rows={name: row for row, name in enumerate(model.names)},
        effect=model.effect,
        z=z,
        reach=reach,
        records=size.records,
        spend=None if size.spend is None else float(size.spend),
        bias=inf if study.tolerance.bias is None else float(study.tolerance.bias),
        least_f=float(study.tolerance.floor_of_f),
        design_effects={route: design_effect(study, route) for route in study.routes},
        scale=scale,
    )


def design_effect(study: Study, route: str) -> float:
    """Return by what clustering multiplies the variance of the contrast (Moulton 1986).

    1 + (m − 1) · icc_x · icc_y for clusters of m units.
    """
    match study.design_effect:
        case ClusterDesign(holds=m, icc_treatment=icc_x, icc_outcome=icc_y):
            return 1 + (m - 1) * icc_x * icc_y
        case float() | int() as number:
            return number
        case by_route:
            return by_route.get(route, 1.0)


def limits_of(study: Study, demand: Demand | None = None, route: str = "") -> dict[str, Fraction]:
    """Return every limit of a study by its name, as far as it can stand in the way of a route."""
    known, tolerance = demand is not None, study.tolerance
    records = study.size.records
    limits = {
        "budget": study.budget if study.size.spend is None else money(study),
        "frame_size": None if study.frame_size is None else Fraction(study.frame_size),
        "least_reliability": tolerance.least_reliability,
        "bias": tolerance.bias if known else None,
        "first_stage_F": tolerance.floor_of_f if known and route == "instrument" else None,
        "records": Fraction(records) if known and records is not None else None,
        **{f"burdens.{name}": burden.limit for name, burden in study.terms.burdens.items()},
    }
    return {name: limit for name, limit in limits.items() if limit is not None}


def money(study: Study) -> Fraction:
    """Return what may be spent, where the money is to buy precision."""
    assert study.size.spend is not None, "the money is given"
    return min(study.size.spend, study.size.spend if study.budget is None else study.budget)


def within_limits(
    study: Study, lifted: Iterable[str] = (), demand: Demand | None = None, route: str = ""
) -> Within:
    """Return what a plan has to stay within, some limits lifted."""
    limits = limits_of(study, demand, route)
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
        spend=limits.get("budget") if study.size.spend is not None else None,
        demand=None if demand is None else lifted_demand(demand, limits, route),
    )


def lifted_demand(demand: Demand, limits: Mapping[str, Fraction], route: str) -> Demand:
    """Return a demand without the limits that are lifted.

    Where the number of records is lifted it may be larger; where money is lifted that was to buy
    precision, any precision will do: as many records as degrees of freedom and first stage take.
    """
    least_f = demand.least_f if not route or "first_stage_F" in limits else 0.0
    bias = demand.bias if "bias" in limits else inf
    demand = replace(demand, bias=bias, least_f=least_f)
    if demand.records is not None and "records" not in limits:
        return replace(demand, records=None, reach=ANY_WIDTH, at_least=demand.records)
    if demand.spend is not None and "budget" not in limits:
        return replace(demand, spend=None, reach=ANY_WIDTH)
    return demand


def reliable(prices: PriceList, least: Fraction) -> PriceList:
    """Return the price list without ways below a reliability."""

    def kept(ways: Mapping[str, Way]) -> dict[str, Way]:
        return {name: way for name, way in ways.items() if way.reliability >= least}

    ways = {variable: kept(named) for variable, named in prices.ways.items()}
    return replace(prices, ways={variable: named for variable, named in ways.items() if named})


def exceeded(
    study: Study, answer: Answer, demand: Demand | None = None, route: str = ""
) -> tuple[Exceeded, ...]:
    """Return the limits that an answer breaks, each with what it needs: the least if proved."""
    found = []
    for limit, allowed in limits_of(study, demand, route).items():
        needed = needed_of(limit, answer, study.prices)
        is_floor = limit in {"least_reliability", "first_stage_F"}
        if is_beyond(limit, allowed if is_floor else needed, needed if is_floor else allowed):
            found.append(Exceeded(limit, allowed, needed, answer.proved))
    return tuple(found)


def is_beyond(limit: str, more: Fraction, less: Fraction) -> bool:
    """Say whether the first number is larger; rounding is forgiven where it was computed."""
    is_computed = limit in {"bias", "first_stage_F"}
    return float(more) > float(less) * (1 + FORGIVEN) + ROUNDING if is_computed else more > less


def needed_of(limit: str, answer: Answer, prices: PriceList) -> Fraction:
    """Return what an answer needs of a limit."""
    bill, precision = answer.bill, answer.precision
    match limit:
        case "budget":
            return bill.total
        case "frame_size":
            return Fraction(bill.started)
        case "least_reliability":
            return min(prices.ways[variable][way].reliability for variable, way in bill.ways)
        case "records":
            return Fraction(bill.records)
        case "bias" | "first_stage_F":
            assert precision is not None, "what is limited was worked out"
            reached = precision.bias_bound if limit == "bias" else precision.first_stage_f
            return Fraction(reached or 0.0)
        case _:
            return bill.burdens[limit.removeprefix("burdens.")]

"""The limits of a study: by name, lifted, and what an answer needs of them."""

from collections.abc import Iterable, Mapping
from dataclasses import replace
from fractions import Fraction

from costs.bill import Bill
from costs.prices import PriceList, Way
from planner.plan import Exceeded
from planner.program import Within
from planner.study import Study

__all__ = ["exceeded", "limits_of", "within_limits"]


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

    def kept(ways: Mapping[str, Way]) -> dict[str, Way]:
        return {name: way for name, way in ways.items() if way.reliability >= least}

    ways = {variable: kept(named) for variable, named in prices.ways.items()}
    return replace(prices, ways={variable: named for variable, named in ways.items() if named})


def exceeded(study: Study, bill: Bill, *, proved: bool) -> tuple[Exceeded, ...]:
    """Return the limits that a bill breaks.

    Parameters
    ----------
    proved
        Whether nothing cheaper would do, so that what is needed is the least.
    """
    found = []
    for limit, allowed in limits_of(study).items():
        needed = needed_of(limit, bill, study.prices)
        if needed < allowed if limit == "least_reliability" else needed > allowed:
            found.append(Exceeded(limit, allowed, needed, proved))
    return tuple(found)


def needed_of(limit: str, bill: Bill, prices: PriceList) -> Fraction:
    """Return what a bill needs of a limit."""
    match limit:
        case "budget":
            return bill.total
        case "frame_size":
            return Fraction(bill.started)
        case "least_reliability":
            return min(prices.ways[variable][way].reliability for variable, way in bill.ways)
        case _:
            return bill.burdens[limit.removeprefix("burdens.")]

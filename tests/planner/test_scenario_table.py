"""The tariff example to the cent and the record, route by route and tolerance by tolerance.

The expected answers were found by complete enumeration of sets, ways and records, done apart from
this code and before it was written; the diagram, strengths and prices are those of the example.
"""

from dataclasses import replace
from fractions import Fraction
from functools import cache
from math import floor

import pytest

from planner import read_study, recommend
from planner.plan import RouteAnswer
from planner.study import Size, Study, Tolerance
from tests.conftest import ROOT


@cache
def tariff() -> Study:
    """The example as it stands."""
    return read_study(ROOT / "examples" / "tariff.yaml")


@cache
def answers(bias: str | None, records: int | None = None) -> dict[str, RouteAnswer]:
    """What is said of each route at a tolerance, and for so many records."""
    study = tariff()
    study = replace(study, tolerance=Tolerance(bias=None if bias is None else Fraction(bias)))
    if records is not None:
        terms = replace(study.terms, records=records)
        study = replace(study, size=Size(records=records), terms=terms, frame_size=None)
    return {each.route: each for each in recommend(study).effects[0].routes}


def to_the_cent(amount: Fraction) -> str:
    """An amount as it is shown: half a cent is rounded up."""
    return f"{floor(amount * 100 + Fraction(1, 2)) / 100:.2f}"


CONDITIONING = {
    "climate": "file",
    "dwelling": "ask",
    "electric_heat": "ask",
    "household_size": "ask",
    "home_working": "ask",
    "routine": "scale",
    "season": "frame",
}
TABLE = [
    # route, tolerance, instrument or mediator, covariates and their ways, ways of treatment, outcome
    # and instrument or mediator, records, started, total, bias bound in per cent
    (
        "conditioning",
        "0.15",
        None,
        CONDITIONING | {"concern": "battery", "income": "ask", "tenure": "ask"},
        ("record", "meter"),
        (229, 280, "25848.00", 14.9),
    ),
    (
        "conditioning",
        None,
        None,
        CONDITIONING | {"concern": "short"},
        ("ask", "photo"),
        (273, 333, "19239.90", 51.2),
    ),
    (
        "instrument",
        "0.15",
        "invited",
        {each: CONDITIONING[each] for each in CONDITIONING if each != "routine"},
        ("record", "meter", "record"),
        (3014, 3676, "109796.10", 5.0),
    ),
    (
        "mechanism",
        "0.15",
        "shift",
        CONDITIONING | {"routine": "diary"},
        ("record", "meter", "diary"),
        (154, 188, "26951.30", 14.2),
    ),
    (
        "mechanism",
        None,
        "shift",
        {"climate": "file", "electric_heat": "ask", "household_size": "ask", "season": "frame"},
        ("ask", "photo", "recall"),
        (325, 397, "20553.83", 82.3),
    ),
]


@pytest.mark.parametrize(
    ("route", "bias", "via", "covariates", "ways", "numbers"),
    TABLE,
    ids=[f"{row[0]}-{row[1]}" for row in TABLE],
)
def test_the_cheapest_study_of_each_route(
    route: str,
    bias: str | None,
    via: str | None,
    covariates: dict[str, str],
    ways: tuple[str, ...],
    numbers: tuple[int, int, str, float],
) -> None:
    plan = answers(bias)[route].plan
    assert plan is not None
    who = plan.covariates, plan.instruments + plan.mediators
    assert who == (tuple(sorted(covariates)), () if via is None else (via,))
    parts = ["tariff", "peak_use", *who[1]]
    assert plan.buy.measure == covariates | dict(zip(parts, ways, strict=True))
    records, started, total, bound = numbers
    bill = plan.buy.bill
    assert (bill.records, bill.started, to_the_cent(bill.total)) == (records, started, total)
    assert plan.buy.proved
    assert plan.precision is not None
    assert plan.precision.effect == pytest.approx(-0.18)
    assert round(100 * plan.precision.bias_bound, 1) == bound


SWEEP = {
    "conditioning": "23134.80 23781.00 25848.00 32810.40 32810.40 33473.00 none",
    "instrument": "109796.10 109796.10 109796.10 109796.10 109796.10 109796.10 110268.13",
    "mechanism": "26951.30 26951.30 26951.30 none none none none",
}


@pytest.mark.parametrize("place", range(7))
def test_what_each_tolerance_of_bias_costs(place: int) -> None:
    """Where nothing is cheap enough in bias, that is the limit in the way."""
    bias = ("0.3", "0.2", "0.15", "0.12", "0.1", "0.08", "0.05")[place]
    for route, answer in answers(bias).items():
        total = SWEEP[route].split()[place]
        if total == "none":
            assert answer.status == "over_limits", (route, bias)
            assert "bias" in {each.limit for each in answer.exceeds}, (route, bias)
        else:
            assert answer.plan is not None, (route, bias)
            assert to_the_cent(answer.plan.buy.bill.total) == total, (route, bias)
            assert answer.plan.buy.proved


def test_the_cheapest_unit_does_not_make_the_cheapest_study() -> None:
    """On very many records the price of a unit decides: it is the lowest by the instrument."""
    per_unit = {}
    for route, answer in answers("0.15", records=1_000_000).items():
        assert answer.plan is not None
        per_unit[route] = to_the_cent(answer.plan.buy.bill.next_unit)
    assert per_unit == {"conditioning": "28.78", "instrument": "23.00", "mechanism": "46.38"}
    plan = answers("0.15", records=1_000_000)["instrument"].plan
    assert plan is not None
    # Climate and season, too, are free for each unit, but not needed.
    assert set(plan.covariates) <= {"climate", "region", "season"}

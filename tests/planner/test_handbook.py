"""Numbers of handbooks, each with its source in ``reference/handbook_values.yaml``, against the planner.

The planner sizes a study for one coefficient in linear models, so that these tables of the same
handbooks have nothing to be compared with yet: several coefficients tested together, proportions on
the arcsine scale, analysis of variance and tables of counts (Cohen 1992), finite populations and
the best take of a cluster (Cochran 1977), repeated readings (Spearman 1910; Brown 1910),
misclassified yes/no confounders (Greenland 1980), critical values of weak instruments (Stock & Yogo
2005; Lee et al. 2022), allocation to strata or arms (Neyman 1934), two-phase samples (Neyman 1938),
repeats per subject (Cochran 1977), events of survival studies (Schoenfeld 1983) and E-values
(VanderWeele & Ding 2017).
"""

from collections.abc import Callable
from fractions import Fraction
from math import ceil, sqrt
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import yaml

from costs.bill import bill_for
from costs.prices import Component, PriceList, Terms, Way
from planner import read_study, recommend
from planner.limits import demand_of
from planner.linear import LinearModel
from planner.plan import Plan
from planner.precision import Parts, as_read, covariance
from planner.routes import ROUTES
from planner.study import Tolerance
from tests.conftest import ROOT

Value = dict[str, Any]
ENTRIES: dict[str, Value] = {
    entry["id"]: entry
    for entry in yaml.safe_load(
        (ROOT / "tests" / "reference" / "handbook_values.yaml").read_text(encoding="utf-8")
    )
}
NAMED: set[str] = set()
"""Entries that a test names."""


def handbook(name: str) -> pytest.MarkDecorator:
    """Run a test on each value of an entry."""
    NAMED.add(name)
    values = ENTRIES[name]["values"]
    return pytest.mark.parametrize("value", values, ids=[str(v) for v in values])


Planned = Callable[..., Plan]


@pytest.fixture
def planned(write: Callable[..., Path]) -> Planned:
    """Plan a study; covariates cost nothing, all else 1."""

    def plan(
        size: dict[str, Any],
        variables: dict[str, dict[str, Any]],
        route: str = "conditioning",
        **more: Any,
    ) -> Plan:
        priced = {
            name: {"per_unit": 0 if name == "c" else 1, **each} for name, each in variables.items()
        }
        study = {
            "effect": {"treatment": "x", "outcome": "y"},
            "size": size,
            "routes": [route],
            "variables": priced,
            **more,
        }
        text = yaml.safe_dump(rounded(study), sort_keys=False)
        found = recommend(read_study(write(text))).effects[0].answer(route).plan
        assert found is not None
        return found

    return plan


def rounded(value: Any) -> Any:
    """The same with no more decimals than a study file takes."""
    match value:
        case float():
            return round(value, 14)
        case dict():
            return {key: rounded(each) for key, each in value.items()}
        case list():
            return [rounded(each) for each in value]
    return value


def core(plan: Plan) -> int:
    """The records of a plan, degrees of freedom left aside."""
    return plan.buy.bill.records - len(plan.buy.measure) - 1


def slope(b: float, residual: float = 1.0, r2: float = 0.0, g: float = 0.0) -> dict[str, Any]:
    """y = b·x + g·c + noise with x and c of SD 1, c explaining ``r2`` of x; in natural units."""
    sd = sqrt(b**2 + g**2 + 2 * b * g * sqrt(r2) + residual)
    variables = {
        "x": {"sd": 1, "caused_by": {"c": sqrt(r2)} if r2 else {}},
        "y": {"sd": sd, "caused_by": {"x": b / sd, **({"c": g / sd} if g else {})}},
    }
    return variables | ({"c": {}} if g else {})


@handbook("two_means")
def test_two_means(value: Value, planned: Planned) -> None:
    """A yes/no treatment of half the units; d is in SDs within the groups. The exact t test needs up
    to two units less: degrees of freedom are rounded up here.
    """
    d = value["d"]
    variables = slope(d / 2)
    variables["x"] = {"share": 0.5}
    records = planned(
        {"detect": d, "power": value["power"], "in": "units"}, variables
    ).buy.bill.records
    assert 0 <= records - 2 * value["exact"] < 2
    assert abs(value["table"] - value["exact"]) <= 0.5


@handbook("correlation")
def test_correlation(value: Value, planned: Planned) -> None:
    """Up to two records fewer than the table: the variance is that of a slope, not of Fisher's z."""
    r = value["r"]
    plan = planned({"detect": "implied"}, {"x": {}, "y": {"caused_by": {"x": r}}})
    assert 0 <= value["table"] - plan.buy.bill.records <= 2
    assert 0 <= value["fisher"] - plan.buy.bill.records <= 3


@handbook("adjusted_slope")
def test_adjusted_slope(value: Value, planned: Planned) -> None:
    """A confounder that explains half of x doubles n; a cause of y that explains half of the rest
    halves it, and is measured although nothing asks for it.
    """
    g = 0.3 if value["r2"] else sqrt(1 - value["residual"])
    variables = slope(0.2, value["residual"], value["r2"], g)
    plan = planned({"detect": "implied", "in": "units"}, variables)
    assert core(plan) == ceil(value["n"])
    assert plan.covariates == (("c",) if g else ())
    assert set(plan.extras) == ({"c"} if g and not value["r2"] else set())


@handbook("baseline_of_the_outcome")
def test_baseline_of_the_outcome(value: Value, planned: Planned) -> None:
    """Both plans round degrees of freedom up by one or two."""
    d, r = value["d"], value["r"]
    found = []
    for g in (0.0, r):
        variables = slope(d / 2, 1 - g**2, 0.0, g)
        variables["x"] = {"share": 0.5}
        found.append(planned({"detect": d, "in": "units"}, variables))
    without, having = found
    assert without.precision is not None
    assert having.precision is not None
    ratio = having.precision.variance / without.precision.variance
    assert value["without"] * ratio == pytest.approx(value["with"])
    assert without.buy.bill.records == pytest.approx(value["without"], abs=1)
    assert having.buy.bill.records == pytest.approx(value["with"], abs=3)


@handbook("half_width")
def test_half_width(value: Value, planned: Planned) -> None:
    g = 0.1 * value["sd"] if value["r2"] else 0.0
    variables = slope(0.01 * value["sd"], value["sd"] ** 2, value["r2"], g)
    plan = planned({"half_width": value["half_width"], "in": "units"}, variables)
    assert core(plan) == ceil(value["n"])
    assert plan.precision is not None
    assert plan.precision.half_width == pytest.approx(value["half_width"], rel=0.005)


@handbook("design_effect")
def test_design_effect(value: Value, planned: Planned) -> None:
    clusters = {
        "holds": value["holds"],
        "icc": {"treatment": value["treatment"], "outcome": value["outcome"]},
    }
    size, variables = {"detect": "implied"}, {"x": {}, "y": {"caused_by": {"x": 0.1}}}
    plan = planned(size, variables, fieldwork={"design_effect": {"clusters": clusters}})
    study = read_study(Path("study.yaml"))
    demand = demand_of(study, study.effects[0])
    assert demand is not None
    assert demand.design_effect("conditioning") == pytest.approx(value["effect"])
    plain = core(planned(size, variables))
    assert (plain - 1) * value["effect"] <= core(plan) < plain * value["effect"] + 1


def pair(r: float) -> LinearModel:
    """x → y."""
    return LinearModel(names=("x", "y"), coefficients={"x": {}, "y": {"x": r}}, effect=r)


@handbook("attenuation")
def test_attenuation(value: Value) -> None:
    noise = {0: 1 / value["treatment"] - 1, 1: 1 / value["outcome"] - 1}
    read = as_read(covariance(pair(value["r"])), noise)
    assert read[0, 1] / sqrt(read[0, 0] * read[1, 1]) == pytest.approx(value["read"], abs=5e-4)


@handbook("attenuated_slope")
def test_attenuated_slope(value: Value, planned: Planned) -> None:
    variables = slope(0.2, 1.0, value["explained"], 0.3 if value["explained"] else 0.0)
    variables["x"]["reliability"] = value["reliability"]
    said = planned({"detect": "implied"}, variables).precision
    assert said is not None
    assert said.limit / said.effect == pytest.approx(value["kept"], abs=5e-5)


@handbook("poor_confounder")
def test_poor_confounder(value: Value, planned: Planned) -> None:
    """In SDs: c → x ρ, c → y g; what is left of the confounding g·ρ."""
    rho, g = value["rho"], value["g"]
    said = planned(
        {"records": 400},
        {
            "x": {"caused_by": {"c": rho}},
            "y": {"caused_by": {"x": 0.25, "c": g}},
            "c": {"reliability": value["reliability"]},
        },
    ).precision
    assert said is not None
    left = said.limit - said.effect
    assert left / (g * rho) == pytest.approx(value["share"], abs=5e-4)
    assert left == pytest.approx(value.get("left", left), abs=5e-5)
    assert said.bias_bound == pytest.approx(left / 0.25)


def test_entry_names() -> None:
    """Every entry has a source, says whether it was at hand, and is named by a test here."""
    assert set(ENTRIES) == NAMED
    assert all(entry["source"] and entry["provenance"] for entry in ENTRIES.values())


@handbook("rule_of_ten")
def test_rule_of_ten(value: Value) -> None:
    """4,000 samples of 200: a share is off by 0.005, four of which are allowed."""
    floor, n, count = value["floor"], 200, 4_000
    assert Tolerance().floor_of_f == floor
    rho = sqrt(floor / (n + floor))
    rng = np.random.default_rng(8)
    z = rng.standard_normal((count, n))
    x = rho * z + sqrt(1 - rho**2) * rng.standard_normal((count, n))
    z -= z.mean(axis=1, keepdims=True)
    x -= x.mean(axis=1, keepdims=True)
    r2 = (z * x).sum(axis=1) ** 2 / ((z * z).sum(axis=1) * (x * x).sum(axis=1))
    share = np.mean(r2 / (1 - r2) * (n - 2) > value["rule"])
    assert share == pytest.approx(value["share"], abs=0.02)


def instrumented(b: float, rho: float) -> dict[str, Any]:
    """z → x → y with a residual variance of 1; in natural units."""
    variables = slope(b)
    variables["x"]["caused_by"] = {"z": rho}
    return variables | {"z": {}}


@handbook("first_stage")
def test_first_stage(value: Value, planned: Planned) -> None:
    n = value["n"]
    said = planned(
        {"records": n},
        instrumented(0.2, sqrt(value["r2"])),
        "instrument",
        tolerance={"first_stage_F": 0},
    ).precision
    assert said is not None
    assert said.first_stage_f is not None
    assert said.first_stage_f * (n - 2) / n == pytest.approx(value["f"], abs=0.05)


@handbook("expected_first_stage")
def test_expected_first_stage(value: Value, planned: Planned) -> None:
    plan = planned(
        {"half_width": 10},
        instrumented(0.2, sqrt(value["r2"])),
        "instrument",
        tolerance={"first_stage_F": value["expected"] - 1},
    )
    assert plan.buy.bill.records == value["n"]


@handbook("price_of_an_instrument")
def test_price_of_an_instrument(value: Value, planned: Planned) -> None:
    size = {"detect": "implied", "in": "units"}
    variables = instrumented(0.2, sqrt(value["rho2"]))
    assert core(planned(size, variables)) == value["plain"]
    assert core(planned(size, variables, "instrument")) == value["n"]


@handbook("published_instruments")
def test_published_instruments(value: Value) -> None:
    """From a regression and the strength of an instrument to the error of its estimate, all within
    half a printed digit: s_xx.W = 1, s_yy.xW = SE² · freedom, s_zx.W = ρ.
    """
    rho, ols, iv = sqrt(value["rho2"]), value["ols"], value["iv"]
    s_yy = value["ols_se"] ** 2 * value["freedom"] + ols**2
    sigma = np.array([[1, ols, rho], [ols, s_yy, iv * rho], [rho, iv * rho, 1]])
    found = ROUTES["instrument"].precision.estimate(sigma, Parts(x=0, y=1, w=(), z=(2,)))
    assert found.limit == pytest.approx(iv)
    assert sqrt(found.variance / value["freedom"]) == pytest.approx(value["iv_se"], abs=5e-4)


@handbook("attrition")
def test_attrition(value: Value) -> None:
    """Steps one after the other, each a component that needs the one before; or the usable share."""
    steps = value["steps"]
    components = {
        f"visit{at}": Component(
            yields=Fraction(str(share)), needs=(f"visit{at - 1}",) if at else ()
        )
        for at, share in enumerate(steps)
    }
    way = Way(per_unit=Fraction(1), needs=(f"visit{len(steps) - 1}",))
    prices = PriceList(ways={"x": {"ask": way}}, components=components)
    bill = bill_for([("x", "ask")], prices, Terms(records=value["records"]))
    assert bill.started == value["started"]
    usable = Fraction(1)
    for share in steps:
        usable *= Fraction(str(share))
    prices = PriceList(ways={"x": {"ask": Way(per_unit=Fraction(1))}}, components={})
    terms = Terms(records=value["records"], usable=usable)
    assert bill_for([("x", "ask")], prices, terms).started == value["started"]


@handbook("product")
def test_product(value: Value) -> None:
    """s_xx = 1, s_mm.x = SE_a² · n, s_yy.mx = SE_b² · n · s_mm.x; the treatment stands beside m."""
    n, a, b = value["n"], value["a"], value["b"]
    s_mm = value["a_se"] ** 2 * n
    s_yy = value["b_se"] ** 2 * n * s_mm
    # y = b·m + noise: a direct effect would change nothing, x being in the regression.
    mm = a**2 + s_mm
    sigma = np.array([[1, a, a * b], [a, mm, b * mm], [a * b, b * mm, b**2 * mm + s_yy]])
    found = ROUTES["mechanism"].precision.estimate(sigma, Parts(x=0, y=2, w=(), m=(1,)))
    assert found.limit == pytest.approx(a * b)
    error = sqrt(found.variance / n)
    assert error == pytest.approx(value["first"], abs=5e-5)
    assert value["second"] / error == pytest.approx(1.016, abs=0.001)


@handbook("front_door")
def test_front_door(value: Value, planned: Planned) -> None:
    variables = {
        "x": {},
        "m": {"caused_by": {"x": value["a"]}},
        "y": {"caused_by": {"m": value["b"]}},
    }
    hidden = [{"of": ["x", "y"], "strength": value["confounding"]}]
    said = planned({"records": 400}, variables, "mechanism", hidden_common_causes=hidden).precision
    assert said is not None
    assert said.variance == pytest.approx(value["variance"])
    assert said.limit == pytest.approx(value["a"] * value["b"])


@handbook("power_of_a_product")
def test_power_of_a_product(value: Value, planned: Planned) -> None:
    """All noise has a variance of 1, so that m varies by 1 + a² and y by 1 + b²(1 + a²)."""
    a, b = value["a"], value["b"]
    m = sqrt(1 + a**2)
    y = sqrt(1 + b**2 * m**2)
    variables = {
        "x": {},
        "m": {"caused_by": {"x": a / m}},
        "y": {"caused_by": {"m": b * m / y}},
    }
    said = planned({"records": value["n"]}, variables, "mechanism").precision
    assert said is not None
    assert said.power == pytest.approx(value["ours"], abs=0.002)
    assert said.power == pytest.approx(value["printed"], abs=0.1)

"""The joint search where it once went wrong: each case with what happened, and to whom."""

import json
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from planner import read_study, recommend
from planner.plan import Recommendation
from planner.ranges import Blocks, ranged
from tests.benchmarks.thirty_candidates import thirty_candidates
from tests.random_studies import text_of

ESSENTIAL = {"x": "conditioning", "m": "mechanism", "z": "instrument"}
"""Whom each route cannot do without."""
HEAD = "effect: {treatment: x, outcome: y}\n"


@pytest.fixture
def answered(write: Callable[..., Path]) -> Callable[..., Recommendation]:
    """Answer a study, given as text."""
    return lambda text, **options: recommend(read_study(write(text)), **options)


@pytest.mark.parametrize("seed", range(20))
def test_a_range_holds_nothing_taken_out(seed: int) -> None:
    """Rounding once ruled out 0, and a weak instrument was divided by."""
    rng = np.random.default_rng(seed)
    root = rng.normal(size=(6, 6))
    a = root @ root.T
    u = rng.normal(size=(6, 3))
    blocks = Blocks.of(a, np.zeros((6, 3), dtype=bool))
    for other in (u, -u, rng.normal(size=(6, 3))):
        low, high = ranged(np.linalg.inv(a), u, other, blocks)
        taken = np.sum((np.linalg.inv(a) @ u) * other, axis=0)
        assert (low <= 0).all()
        assert (high >= 0).all()
        assert (low <= taken + 1e-12).all()
        assert (taken - 1e-12 <= high).all()


@pytest.mark.parametrize("gone", ["x", "m", "z"])
def test_a_limit_may_take_away_somebody_essential(
    answered: Callable[..., Recommendation], gone: str
) -> None:
    """Without a reliable enough reading of somebody essential the search once fell over."""
    poor = {name: "0.5" if name == gone else "0.9" for name in "xmz"}
    answer = answered(
        HEAD
        + f"""
size: {{half_width: 0.1}}
tolerance: {{least_reliability: 0.6, first_stage_F: 0}}
routes: [{ESSENTIAL[gone]}]
hidden_common_causes: {[] if gone == "x" else [["x", "y"]]}
default_strength: 0.2
variables:
  z: {{per_unit: 1, reliability: {poor["z"]}}}
  x: {{caused_by: {{z: 0.4}}, per_unit: 1, reliability: {poor["x"]}}}
  m: {{caused_by: {{x: 0.5}}, per_unit: 1, reliability: {poor["m"]}}}
  y: {{caused_by: {{m: 0.4}}, per_unit: 1}}
"""
    )
    (route,) = answer.effects[0].routes
    assert route.status == "over_limits"
    assert [each.limit for each in route.exceeds] == ["least_reliability"]


def test_free_readings_do_not_buy_more_records_than_there_can_be(
    answered: Callable[..., Recommendation],
) -> None:
    """Doubling once ran past the most records that are counted."""
    answer = answered(
        HEAD + "size: {spend: 100}\nvariables: {x: {per_unit: 0}, y: {caused_by: {x: 0.3},"
        " per_unit: 0}}\n"
    )
    assert answer.buy is not None
    assert answer.buy.bill.records == 10**9


def test_an_estimate_without_variance_is_no_number(
    answered: Callable[..., Recommendation],
) -> None:
    """An instrument that moves nothing has no finite variance, which JSON cannot say."""
    answer = answered(
        HEAD + "size: {records: 50}\nroutes: [instrument]\ntolerance: {first_stage_F: 0}\n"
        "hidden_common_causes: [{of: [x, y], strength: 0.2}]\nvariables:\n"
        "  z: {per_unit: 1}\n  x: {caused_by: {z: 1.0e-11}, per_unit: 1}\n"
        "  y: {caused_by: {x: 0.3}, per_unit: 1}\n"
    )
    assert json.loads(json.dumps(answer.as_dict(), allow_nan=False))


def test_free_candidates_that_tie_are_not_gone_through(
    answered: Callable[..., Recommendation],
) -> None:
    """Twenty free candidates that change nothing once took all the time there was."""
    free = "".join(f"  f{number}: {{per_unit: 0}}\n" for number in range(20))
    answer = answered(
        HEAD + "size: {records: 300}\ntolerance: {bias: 0.1}\nroutes: [conditioning]\nvariables:\n"
        "  c: {ways: {poor: {per_unit: 1, reliability: 0.5}, good: {per_unit: 2, reliability:"
        " 0.95}}}\n  x: {caused_by: {c: 0.4}, per_unit: 1}\n"
        "  y: {caused_by: {x: 0.3, c: 0.3}, per_unit: 1}\n" + free,
        seconds=20,
    )
    assert answer.buy is not None
    assert answer.buy.proved
    assert answer.buy.measure == {"x": "standard", "y": "standard", "c": "good"}


def test_a_search_that_is_cut_short_ends_and_says_so(
    answered: Callable[..., Recommendation],
) -> None:
    """With next to no time there is a study all the same, and a bound that is not above it."""
    study = thirty_candidates(3)
    start = time.perf_counter()
    answer = answered(text_of(study), seconds=0.2)
    assert time.perf_counter() - start < 30
    assert answer.buy is not None
    assert not answer.buy.proved
    assert 0 <= answer.buy.lower_bound < answer.buy.bill.total

"""Limits that take strengths: bias, the first-stage F, records; what is out of reach, what is unchecked."""

from collections.abc import Callable
from pathlib import Path

import pytest

from planner import read_study, recommend
from planner.plan import Exceeded, Recommendation, RouteAnswer

CONFOUNDED = """\
variables:
  x: {caused_by: {c: 0.4}, per_unit: 1}
  y: {caused_by: {x: 0.3, c: 0.3}, per_unit: 1}
  c:
    ways:
      good: {per_unit: 8, reliability: 0.95}
      poor: {per_unit: 2, reliability: 0.5}
"""
POOR, GOOD = 0.3 * 0.4 * 0.5 / (1 - 0.5 * 0.16) / 0.3, 0.3 * 0.4 * 0.05 / (1 - 0.95 * 0.16) / 0.3
"""What the two readings of c leave of the confounding, as a share of the effect: 21.7 % and 2.4 %."""
INSTRUMENT = """\
variables:
  z: {per_unit: 1}
  x: {caused_by: {z: 0.2}, per_unit: 1}
  y: {caused_by: {x: 0.3}, per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.2}]
"""
PER_RECORD = 0.04 / 0.96
"""What a record adds to the F of z."""

Answered = Callable[..., Recommendation]


@pytest.fixture
def answered(write: Callable[..., Path]) -> Answered:
    """Answer a study of this size."""

    def answer(size: str, text: str, *lines: str) -> Recommendation:
        head = f"effect: {{treatment: x, outcome: y}}\nsize: {size}\n"
        return recommend(read_study(write("\n".join([head + text, *lines, ""]))))

    return answer


def only(found: Recommendation, route: str = "conditioning") -> RouteAnswer:
    """What is said of one route."""
    return found.effects[0].answer(route)


def in_the_way(route: RouteAnswer) -> dict[str, tuple[float, float]]:
    """By limit what is allowed and what is needed."""
    assert route.status == "over_limits"
    assert route.plan is None
    assert all(each.proved for each in route.exceeds)
    assert route.reason.variables == tuple(each.limit for each in route.exceeds)
    return {each.limit: (float(each.allowed), float(each.needed)) for each in route.exceeds}


# ------------------------------------------------------------------------------------------- bias


@pytest.mark.parametrize(("bias", "way", "price"), [(0.25, "poor", 4), (0.05, "good", 10)])
def test_a_reading_that_leaves_too_much_bias_is_not_bought(
    bias: float, way: str, price: int, answered: Answered
) -> None:
    found = answered("{records: 100}", CONFOUNDED, f"tolerance: {{bias: {bias}}}")
    plan = only(found).plan
    assert plan is not None
    assert plan.precision is not None
    assert plan.buy.measure["c"] == way
    assert (plan.buy.bill.total, plan.buy.proved) == (100 * price, True)
    assert plan.precision.bias_bound == pytest.approx(POOR if way == "poor" else GOOD)
    assert plan.precision.bias_sources == {f"c.{way}": pytest.approx(plan.precision.bias_bound)}


@pytest.mark.parametrize("size", ["{records: 100}", "{detect: implied}", "{half_width: 0.1}"])
def test_bias_in_the_way_is_named_with_what_the_cheapest_plan_leaves(
    size: str, answered: Answered
) -> None:
    found = answered(size, CONFOUNDED, "tolerance: {bias: 0.01}")
    route = only(found)
    assert in_the_way(route) == {"bias": (0.01, pytest.approx(POOR))}
    assert (found.status, found.buy, route.reason.kind) == ("over_limits", None, "over_limits")
    assert route.beyond is not None
    assert route.beyond.buy.measure["c"] == "poor"
    values = found.as_dict()["effects"][0]["routes"][0]
    assert values["exceeds"] == [
        {"limit": "bias", "allowed": 0.01, "needed": pytest.approx(POOR), "proved": True}
    ]
    assert values["beyond"]["precision"]["bias_bound"] == pytest.approx(POOR)


def test_bias_and_budget_can_each_be_lifted(answered: Answered) -> None:
    """On 100 records the good reading is 1,000 in all, the poor one 400.

    Fewer records would be cheaper, but 100 are asked for: `records` is no way out of a budget.
    """
    route = only(answered("{records: 100}", CONFOUNDED, "tolerance: {bias: 0.05}", "budget: 500"))
    assert in_the_way(route) == {"budget": (500, 1000), "bias": (0.05, pytest.approx(POOR))}
    assert route.beyond is not None
    assert route.beyond.buy.bill.total == 400


def test_bias_and_budget_can_be_in_the_way_together(answered: Answered) -> None:
    route = only(answered("{records: 100}", CONFOUNDED, "tolerance: {bias: 0.05}", "budget: 300"))
    assert in_the_way(route) == {"budget": (300, 1000)}
    route = only(answered("{records: 100}", CONFOUNDED, "tolerance: {bias: 0.01}", "budget: 300"))
    assert in_the_way(route) == {"budget": (300, 400), "bias": (0.01, pytest.approx(POOR))}
    assert route.reason.kind == "over_limits_together"


@pytest.mark.parametrize(("allowed", "way"), [(1 - 5e-10, "poor"), (1 - 5e-9, "good")])
def test_a_limit_on_bias_forgives_a_rounding_error(
    allowed: float, way: str, answered: Answered
) -> None:
    tolerance = f"tolerance: {{bias: {POOR * allowed:.14f}}}"
    plan = only(answered("{records: 100}", CONFOUNDED, tolerance)).plan
    assert plan is not None
    assert plan.buy.measure["c"] == way


@pytest.mark.parametrize("size", ["{records: 400}", "{detect: implied}"])
def test_readings_without_error_pass_a_tolerance_of_nothing(size: str, answered: Answered) -> None:
    """The bound was 1.1e-16 by rounding, and a study without any error had no plan."""
    text = """\
variables:
  c: {per_unit: 1}
  d: {caused_by: {c: 0.3}, per_unit: 1}
  x: {caused_by: {c: 0.3, d: -0.3}, per_unit: 1}
  y: {caused_by: {x: 0.25, c: 0.3, d: 0.3}, per_unit: 1, reliability: 0.7}
"""
    assert answered(size, text, "tolerance: {bias: 0}").status == "recommended"


@pytest.mark.parametrize("size", ["{records: 9000}", "{detect: implied}"])
def test_an_instrument_passes_a_tolerance_of_nothing_however_it_is_read(
    size: str, answered: Answered
) -> None:
    text = """\
variables:
  w: {per_unit: 1}
  z: {caused_by: {w: 0.3}, per_unit: 1, reliability: 0.7}
  x: {caused_by: {z: 0.4}, per_unit: 1, reliability: 0.7}
  y: {caused_by: {x: 0.3, w: 0.3}, per_unit: 1, reliability: 0.7}
hidden_common_causes: [[x, y]]
default_strength: 0.2
"""
    found = answered(size, text, "tolerance: {bias: 0}")
    assert found.effects[0].recommended == "instrument"


def test_another_route_keeps_the_limit_on_bias(answered: Answered) -> None:
    """A treatment read at 0.6 biases a regression, but not an instrument."""
    text = """\
variables:
  z: {per_unit: 5}
  x: {caused_by: {z: 0.5}, per_unit: 1, reliability: 0.6}
  y: {caused_by: {x: 0.3}, per_unit: 1}
"""
    free = answered("{records: 400}", text)
    bound = answered("{records: 400}", text, "tolerance: {bias: 0.2}")
    assert [each.effects[0].recommended for each in (free, bound)] == ["conditioning", "instrument"]
    route = only(bound)
    # z among the covariates would make it worse, and nobody needs it.
    assert in_the_way(route) == {"bias": (0.2, pytest.approx(0.4))}


# ---------------------------------------------------------------------------------------- records


@pytest.mark.parametrize("records", [1, 3, 4])
def test_as_many_records_as_variables_say_nothing(records: int, answered: Answered) -> None:
    """x, y and c: five records leave one for the error, four leave none."""
    found = answered(f"{{records: {records}}}", CONFOUNDED)
    route = only(found)
    assert (found.status, found.buy) == ("over_limits", None)
    assert route.exceeds == (Exceeded("records", records, 5),)
    assert route.beyond is not None
    assert route.beyond.buy.bill.records == 5


def test_one_record_more_is_enough(answered: Answered) -> None:
    plan = only(answered("{records: 5}", CONFOUNDED)).plan
    assert plan is not None
    assert plan.precision is not None
    # V = s_yy.xc*/s_xx.c* = 0.8577 on one degree of freedom, and z = 1.96.
    assert plan.precision.half_width == pytest.approx(1.959964 * 0.857703**0.5, rel=1e-5)


def test_too_few_records_and_too_little_money_are_in_the_way_together(answered: Answered) -> None:
    route = only(answered("{records: 4}", CONFOUNDED, "budget: 10"))
    assert route.status == "over_limits"
    assert {each.limit for each in route.exceeds} == {"records", "budget"}


# ---------------------------------------------------------------------------------- first-stage F


@pytest.mark.parametrize(("tolerance", "floor"), [("{}", 20), ("{first_stage_F: 10}", 10)])
def test_a_weak_instrument_is_in_the_way(tolerance: str, floor: int, answered: Answered) -> None:
    """On 100 records F is 4.2; lift the floor, or take ⌈floor · 0.96/0.04⌉ records."""
    route = only(answered("{records: 100}", INSTRUMENT, f"tolerance: {tolerance}"), "instrument")
    assert in_the_way(route) == {
        "first_stage_F": (floor, pytest.approx(100 * PER_RECORD)),
        "records": (100, floor * 24),
    }
    assert route.beyond is not None
    assert route.beyond.buy.bill.records == 100


@pytest.mark.parametrize(("records", "status"), [(479, "over_limits"), (480, "feasible")])
def test_the_floor_is_reached_or_not(records: int, status: str, answered: Answered) -> None:
    assert only(answered(f"{{records: {records}}}", INSTRUMENT), "instrument").status == status


def test_a_floor_of_zero_is_none(answered: Answered) -> None:
    none = "tolerance: {first_stage_F: 0}"
    plan = only(answered("{records: 100}", INSTRUMENT, none), "instrument").plan
    assert plan is not None
    assert plan.precision is not None
    assert plan.precision.first_stage_f == pytest.approx(100 * PER_RECORD)
    sized = only(answered("{half_width: 5}", INSTRUMENT, none), "instrument").plan
    assert sized is not None
    # ⌈19.75 · (1.96/5)²⌉ and four more.
    assert sized.buy.bill.records == 4 + 4


def test_a_target_takes_the_records_that_the_first_stage_needs(answered: Answered) -> None:
    plan = only(answered("{half_width: 5}", INSTRUMENT), "instrument").plan
    assert plan is not None
    assert plan.precision is not None
    assert plan.buy.bill.records == 480
    assert plan.precision.first_stage_f == pytest.approx(20)
    # Where the target takes more than that by itself, the floor does not show.
    plan = only(answered("{detect: implied}", INSTRUMENT), "instrument").plan
    assert plan is not None
    assert plan.buy.bill.records == 1723 + 4


def test_a_design_effect_weakens_the_first_stage(answered: Answered) -> None:
    clustered = "fieldwork: {design_effect: {instrument: 2}}"
    plan = only(answered("{half_width: 5}", INSTRUMENT, clustered), "instrument").plan
    assert plan is not None
    assert plan.precision is not None
    assert plan.buy.bill.records == 960
    assert plan.precision.first_stage_f == pytest.approx(20)


def test_a_design_effect_weakens_the_first_stage_on_fixed_records(answered: Answered) -> None:
    clustered = "fieldwork: {design_effect: {instrument: 2}}"
    route = only(answered("{records: 900}", INSTRUMENT, clustered), "instrument")
    assert in_the_way(route) == {
        "first_stage_F": (20, pytest.approx(450 * PER_RECORD)),
        "records": (900, 960),
    }


def test_in_a_small_frame_the_floor_can_be_lifted(answered: Answered) -> None:
    route = only(
        answered("{half_width: 5}", INSTRUMENT, "fieldwork: {frame_size: 300}"), "instrument"
    )
    assert in_the_way(route) == {
        "frame_size": (300, 480),
        "first_stage_F": (20, pytest.approx(8 * PER_RECORD)),
    }
    assert route.beyond is not None
    assert route.beyond.buy.bill.records == 8


def test_where_the_target_itself_is_too_large_for_the_frame_the_floor_is_no_help(
    answered: Answered,
) -> None:
    route = only(
        answered("{detect: implied}", INSTRUMENT, "fieldwork: {frame_size: 300}"), "instrument"
    )
    assert in_the_way(route) == {"frame_size": (300, 1727)}


def test_a_floor_binds_no_other_route(answered: Answered) -> None:
    found = answered("{records: 100}", CONFOUNDED, "tolerance: {first_stage_F: 1000}")
    assert found.effects[0].recommended == "conditioning"


# -------------------------------------------------------------------------------------- unchecked


def test_without_strengths_the_cheapest_plan_stands_and_nothing_is_checked(
    answered: Answered,
) -> None:
    """Limits that take strengths are no limits then: neither bias, nor F, nor records."""
    limits = "tolerance: {bias: 0.01, first_stage_F: 100}"
    text = CONFOUNDED.replace("c: 0.4", "c: ")
    for records in (3, 100):
        found = answered(f"{{records: {records}}}", text, limits)
        plan = only(found).plan
        assert plan is not None
        assert (plan.precision, plan.buy.measure["c"]) == (None, "poor")
        assert found.as_dict()["effects"][0]["routes"][0]["plan"]["precision"] is None
    found = answered("{records: 100}", INSTRUMENT.replace("z: 0.2", "z: "), limits)
    plan = only(found, "instrument").plan
    assert plan is not None
    assert plan.precision is None
    assert found.effects[0].recommended == "instrument"


def test_without_strengths_the_recommended_route_is_the_cheapest(answered: Answered) -> None:
    """The instrument costs 3 a record, adjusting 5; with strengths it would be too weak."""
    text = """\
variables:
  z: {per_unit: 1}
  c: {per_unit: 3, caused_by: {}}
  x: {caused_by: {z: , c: 0.3}, per_unit: 1}
  y: {caused_by: {x: 0.3, c: 0.3}, per_unit: 1}
"""
    unknown = answered("{records: 100}", text)
    weak = answered("{records: 100}", text.replace("z: ,", "z: 0.1,"))
    assert [each.effects[0].recommended for each in (unknown, weak)] == [
        "instrument",
        "conditioning",
    ]


def test_paths_that_cancel_leave_precision_unchecked(answered: Answered) -> None:
    text = """\
variables:
  x: {per_unit: 1, reliability: 0.5}
  m: {caused_by: {x: 0.5}, per_unit: 1}
  y: {caused_by: {x: -0.15, m: 0.3}, per_unit: 1}
"""
    found = answered("{records: 50}", text, "tolerance: {bias: 0.01}")
    plan = only(found).plan
    assert found.status == "recommended"
    assert plan is not None
    assert plan.precision is None


# ----------------------------------------------------------------------------------- out of reach

UNREADABLE = """\
variables:
  z: {per_unit: 1}
  x: {caused_by: {z: 0.5}, ways: {glance: {per_unit: 1, reliability: 0.0000000001}}}
  y: {caused_by: {x: 0.3}, per_unit: 1}
"""


@pytest.mark.parametrize("size", ["{detect: implied}", "{half_width: 0.1}"])
def test_a_reading_can_be_too_poor_for_any_number_of_records(size: str, answered: Answered) -> None:
    """It keeps 1e-10 of the effect in a regression; an instrument does not mind, but takes records."""
    found = answered(size, UNREADABLE, "routes: [conditioning]", "budget: 100000")
    route = only(found)
    assert (found.status, route.status, route.reason.kind) == (
        "impossible",
        "impossible",
        "out_of_reach",
    )
    assert (route.plan, route.beyond, route.exceeds) == (None, None, ())
    assert found.as_dict()["effects"][0]["routes"][0]["reason"]["text"]


def test_more_than_a_thousand_million_records_are_out_of_reach(answered: Answered) -> None:
    text = "variables:\n  x: {per_unit: 1}\n  y: {caused_by: {x: 0.3}, per_unit: 1}\n"
    # 0.91 · (1.96/h)² is 1.1e9 at h = 5.7e-5 and 8.8e8 at 6.3e-5.
    assert only(answered("{half_width: 0.000057}", text)).reason.kind == "out_of_reach"
    assert only(answered("{half_width: 0.000063}", text)).status == "feasible"


def test_what_is_out_of_reach_by_one_route_may_be_had_by_another(answered: Answered) -> None:
    """So poor a reading of c turns the sign: β = 0.1 − 0.6 · 0.5 · 0.9/(1 − 0.1 · 0.25) = −0.18."""
    text = """\
variables:
  z: {per_unit: 1}
  c: {per_unit: 1, reliability: 0.1}
  x: {caused_by: {z: 0.5, c: 0.5}, per_unit: 1}
  y: {caused_by: {x: 0.1, c: -0.6}, per_unit: 1}
"""
    found = answered("{detect: implied}", text)
    assert only(found).reason.kind == "out_of_reach"
    assert found.status == "recommended"
    assert found.effects[0].recommended == "instrument"


def test_a_limit_that_leaves_only_what_is_out_of_reach_is_named(answered: Answered) -> None:
    """A proper reading takes too long; the glance keeps nothing."""
    text = UNREADABLE.replace("ways: {", "ways: {test: {per_unit: 4, takes: {minutes: 9}}, ")
    route = only(answered("{detect: implied}", text, "burdens: {minutes: {limit: 5}}"))
    assert in_the_way(route) == {"burdens.minutes": (5, 9)}
    assert route.beyond is not None
    assert route.beyond.buy.measure["x"] == "test"


def test_on_fixed_records_what_is_out_of_reach_is_shown(answered: Answered) -> None:
    """A plan as asked for: its interval has no end, its power is that of chance."""
    found = answered("{records: 100}", UNREADABLE, "routes: [conditioning]")
    plan = only(found).plan
    assert plan is not None
    assert plan.precision is not None
    assert plan.precision.power == pytest.approx(0.025, abs=1e-5)
    values = found.as_dict()["effects"][0]["routes"][0]["plan"]["precision"]
    assert values["half_width"] is None

"""Statuses, limits and reasons of whole studies, each small enough to be seen through."""

from collections.abc import Callable
from pathlib import Path

import pytest

from planner import read_study, recommend
from planner.findings import Reason, Trail
from planner.plan import Exceeded, Recommendation

HEAD = "effect: {treatment: x, outcome: y}\nsize: {records: 10}\n"
CONFOUNDED = """\
variables:
  x: {caused_by: [c], per_unit: 1}
  y: {caused_by: [x, c], per_unit: 1}
  c:
    ways:
      good: {per_unit: 8, reliability: 0.9, takes: {minutes: 6}}
      poor: {per_unit: 2, reliability: 0.5, takes: {minutes: 1}}
burdens: {minutes: {}}
"""


def answer(write: Callable[..., Path], text: str) -> Recommendation:
    """The answer to a study."""
    return recommend(read_study(write(HEAD + text)))


def only(found: Recommendation, route: str = "conditioning"):
    """What is said of one route."""
    return found.effects[0].answer(route)


def test_an_outcome_that_does_not_follow_is_no_effect(write: Callable[..., Path]) -> None:
    found = answer(write, "variables: {x: {per_unit: 1}, y: {per_unit: 1}}\n")
    assert found.status == "no_effect"
    assert found.buy is None
    assert {each.status for each in found.effects[0].routes} == {"impossible"}
    assert {each.reason for each in found.effects[0].routes} == {Reason("no_directed_path")}


def test_selection_after_the_treatment_closes_every_route(write: Callable[..., Path]) -> None:
    text = (
        "variables: {x: {per_unit: 1}, y: {caused_by: [x], per_unit: 1},"
        " s: {caused_by: [y], measurable: no}}\nselected_by: [s]\n"
    )
    found = answer(write, text)
    assert found.status == "impossible"
    reason = Reason("selection_after_treatment", Trail(("x", "y", "s"), (True, True)), ("s",))
    assert {each.reason for each in found.effects[0].routes} == {reason}


def test_selection_stands_in_every_conditioning_set(write: Callable[..., Path]) -> None:
    """x → r ← u → y: rows with r only; u must be held, and r itself costs nothing."""
    text = """\
variables:
  x: {caused_by: [a], per_unit: 1}
  r: {caused_by: [a, u], measurable: no}
  a: {measurable: no}
  u: {per_unit: 3}
  y: {caused_by: [x, u], per_unit: 1}
"""
    assert only(answer(write, text)).plan.covariates == ()
    found = answer(write, text + "selected_by: [r]\n")
    assert only(found).plan.covariates == ("u",)
    assert found.as_dict()["effects"][0]["routes"][0]["estimand"] == (
        "average effect, among rows selected by r"
    )


@pytest.mark.parametrize(
    ("limit", "exceeded"),
    [
        ("budget: 30", [Exceeded("budget", 30, 40)]),
        ("fieldwork: {frame_size: 9}", [Exceeded("frame_size", 9, 10)]),
        ("tolerance: {least_reliability: 0.95}", "reliability"),
    ],
)
def test_a_limit_in_the_way_is_named_with_what_would_be_needed(
    limit: str, exceeded: object, write: Callable[..., Path]
) -> None:
    found = answer(write, CONFOUNDED + limit + "\n")
    route = only(found)
    assert (found.status, route.status, found.buy) == ("over_limits", "over_limits", None)
    if exceeded == "reliability":
        (each,) = route.exceeds
        assert (each.limit, float(each.allowed), float(each.needed)) == (
            "least_reliability",
            0.95,
            0.5,
        )
    else:
        assert list(route.exceeds) == exceeded
    assert route.beyond.buy.measure == {"x": "standard", "y": "standard", "c": "poor"}


def test_any_of_several_limits_may_be_lifted(write: Callable[..., Path]) -> None:
    """The good reading is too long, the poor one too poor: lift either, and the poor one is cheaper."""
    text = CONFOUNDED.replace("minutes: {}", "minutes: {limit: 5}")
    route = only(answer(write, text + "tolerance: {least_reliability: 0.8}\n"))
    assert [each.limit for each in route.exceeds] == ["least_reliability", "burdens.minutes"]
    assert route.exceeds[1] == Exceeded("burdens.minutes", 5, 6)
    assert route.beyond.buy.measure["c"] == "poor"
    assert route.reason.variables == ("least_reliability", "burdens.minutes")


def test_where_no_single_limit_helps_all_that_is_broken_is_listed(
    write: Callable[..., Path],
) -> None:
    route = only(answer(write, CONFOUNDED + "budget: 30\nfieldwork: {frame_size: 9}\n"))
    assert route.exceeds == (Exceeded("budget", 30, 40), Exceeded("frame_size", 9, 10))
    assert route.beyond.buy.bill.total == 40


def test_over_limits_wins_over_impossible(write: Callable[..., Path]) -> None:
    found = answer(write, CONFOUNDED + "budget: 30\n")
    assert [each.status for each in found.effects[0].routes] == [
        "over_limits",
        "impossible",
        "impossible",
    ]
    assert found.status == "over_limits"


def test_a_hidden_common_cause_closes_the_back_door_route(write: Callable[..., Path]) -> None:
    text = "variables: {x: {per_unit: 1}, y: {caused_by: [x], per_unit: 1}}\n"
    found = answer(write, text + "hidden_common_causes: [[x, y]]\n")
    reason = only(found).reason
    assert reason.kind == "back_door_open"
    assert reason.trail.names == ("x", "hidden common cause of x and y", "y")
    assert only(found, "instrument").reason == Reason("no_candidate")
    assert only(found, "mechanism").reason.kind == "unmediated"


def test_a_mediator_whose_back_door_nobody_closes(write: Callable[..., Path]) -> None:
    text = """\
variables:
  x: {per_unit: 1}
  m: {caused_by: [x], per_unit: 1}
  y: {caused_by: [m], per_unit: 1}
hidden_common_causes: [[x, m], [x, y]]
"""
    route = only(answer(write, text), "mechanism")
    assert route.reason == Reason("unmediated", Trail(("x", "m", "y"), (True, True)), ("m",))
    (door,) = route.witnesses
    assert door.kind == "mediator_back_door"
    assert door.trail.names == ("x", "hidden common cause of x and m", "m")


def test_a_covariate_can_be_needed_to_keep_an_instrument_linked(
    write: Callable[..., Path],
) -> None:
    """z and x meet only in c, which does not reach x: held, it joins them; and c is no candidate here.

    z → c ← v → x with v unmeasurable. c alone would be the instrument; it also causes y, so it must
    be held, and then z is the instrument.
    """
    text = """\
variables:
  z: {per_unit: 1}
  v: {measurable: no}
  c: {caused_by: [z, v], per_unit: 1}
  x: {caused_by: [v], per_unit: 1}
  y: {caused_by: [x, c], per_unit: 1}
hidden_common_causes: [[x, y]]
"""
    plan = only(answer(write, text), "instrument").plan
    assert (plan.instruments, plan.covariates) == (("z",), ("c",))
    assert plan.needed["c"].kind == "keeps_link"
    assert plan.needed["c"].trail.names == ("z", "c", "v", "x")


def test_what_follows_from_the_treatment_aside_of_the_effect_is_never_adjusted_for(
    write: Callable[..., Path],
) -> None:
    text = """\
variables:
  z: {per_unit: 1}
  x: {caused_by: [z], per_unit: 1}
  y: {caused_by: [x], per_unit: 1}
  e: {caused_by: [x], per_unit: 1}
hidden_common_causes: [[x, y]]
"""
    plan = only(answer(write, text), "instrument").plan
    assert plan.left_out["e"] == Reason("after_treatment", Trail(("x", "e"), (True,)), ("e",))
    assert plan.never == ("e",)


def test_a_collider_is_never_adjusted_for(write: Callable[..., Path]) -> None:
    """x ← a → k ← b → y: nothing to hold, and holding k would open it (Greenland 2003)."""
    text = """\
variables:
  a: {measurable: no}
  b: {measurable: no}
  k: {caused_by: [a, b], per_unit: 1}
  x: {caused_by: [a], per_unit: 1}
  y: {caused_by: [x, b], per_unit: 1}
"""
    plan = only(answer(write, text)).plan
    assert plan.covariates == ()
    assert plan.never == ("k",)
    assert plan.left_out["k"].kind == "opens"
    assert plan.left_out["k"].trail.names == ("x", "a", "k", "b", "y")


def test_without_time_the_answer_is_honest() -> None:
    """Whatever was found in no time at all, it claims no more than it knows."""
    study = read_study(Path(__file__).parents[2] / "examples" / "tariff.yaml")
    found = recommend(study, seconds=0.0)
    for each in found.effects[0].routes:
        assert each.status in {"feasible", "over_limits"}
        if each.plan is not None:
            assert each.plan.buy.lower_bound <= each.plan.buy.bill.total
            assert each.plan.buy.proved == (each.plan.buy.lower_bound == each.plan.buy.bill.total)
        else:
            assert each.reason.kind == "out_of_time"

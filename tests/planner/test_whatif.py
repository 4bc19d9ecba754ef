"""What-if options: from one study to another."""

from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest

from costs.faults import FaultyInput
from costs.prices import Way
from planner import read_study, whatif
from planner.study import Size, Study

STUDY = """\
effect: {treatment: x, outcome: y}
size: {records: 10}
variables:
  x: {per_unit: 1}
  y: {caused_by: [x, c, a.b], per_unit: 1}
  c:
    caused_by: [a.b]
    ways:
      visit:
        {per_unit: 8, needs: [nurse], takes: {minutes: 6}, reliability: 0.9, yields: 0.8, label: seen}
      post: {per_unit: 2}
  a.b: {ways: {c.d: {per_unit: 1, needs: [nurse]}}}
  twice: {per_unit: 1}
components:
  base: {always: yes, setup: 5, needs: [office]}
  office: {setup: 1}
  nurse: {setup: 3, needs: [car]}
  car: {setup: 7}
  twice: {setup: 1}
burdens: {minutes: {limit: 9}}
"""


@pytest.fixture
def study(write: Callable[..., Path]) -> Study:
    return read_study(write(STUDY))


def test_a_variable_that_cannot_be_had_is_not_measurable(study: Study) -> None:
    left = whatif.without(study, "c")
    assert "c" not in left.prices.ways
    assert "c" in left.variables
    assert left.changes == ("--without c",)


def test_a_way_that_cannot_be_had_leaves_the_others(study: Study) -> None:
    assert list(whatif.without(study, "c.visit").prices.ways["c"]) == ["post"]
    both = whatif.without(whatif.without(study, "c.visit"), "c.post")
    assert "c" not in both.prices.ways


def test_names_may_hold_points(study: Study) -> None:
    assert "a.b" not in whatif.without(study, "a.b.c.d").prices.ways
    assert whatif.held(study, "a.b.c.d").prices.ways["a.b"]["c.d"] == Way()


def test_a_component_takes_along_what_needs_it(study: Study) -> None:
    left = whatif.without(study, "car")
    assert list(left.prices.components) == ["base", "office", "twice"]
    assert list(left.prices.ways["c"]) == ["post"]
    assert "a.b" not in left.prices.ways


def test_what_is_held_is_free_but_no_better_than_it_is(study: Study) -> None:
    held = whatif.held(study, "c.visit")
    assert held.prices.ways["c"]["visit"] == Way(
        label="seen", reliability=Fraction("0.9"), yields=Fraction("0.8")
    )
    assert held.prices.ways["c"]["post"] == study.prices.ways["c"]["post"]
    assert held.changes == ("--held c.visit",)


def test_records_and_routes_can_be_set(study: Study) -> None:
    assert whatif.with_records(study, 25).terms.records == 25
    assert whatif.with_records(study, 25).size == Size(records=25)
    assert whatif.with_routes(study, ["mechanism", "conditioning"]).routes == (
        "conditioning",
        "mechanism",
    )


@pytest.mark.parametrize(
    "size",
    [
        Size(half_width=0.1, confidence=0.9, in_units=True),
        Size(detect=0.1, confidence=0.9, in_units=True),
        Size(implied=True, confidence=0.9, in_units=True),
        Size(spend=Fraction(9), confidence=0.9, in_units=True),
    ],
)
def test_records_take_the_place_of_a_target(size: Size, study: Study) -> None:
    changed = whatif.with_records(replace(study, size=size), 25)
    assert changed.size == Size(records=25, confidence=0.9, in_units=True)
    assert changed.terms.records == 25


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda s: whatif.without(s, "nurze"), "--without: 'nurze' is nothing that can be bought.\n    Did you mean 'nurse'?"),
        (lambda s: whatif.without(s, "x"), "--without: without 'x' the treatment 'x' cannot be measured."),
        (lambda s: whatif.without(s, "office"), "--without: 'base' is always bought."),
        (lambda s: whatif.without(s, "twice"), "--without: 'twice' is more than one thing."),
        (lambda s: whatif.held(s, "c"), "--held: 'c' is nothing that can be bought."),
        (lambda s: whatif.with_records(s, 0), "--records: is 0."),
        (lambda s: whatif.with_routes(s, ["road"]), "--route: 'road' is no route that the study allows."),
    ],
)  # fmt: skip
def test_what_cannot_be_is_refused(
    change: Callable[[Study], Study], message: str, study: Study
) -> None:
    with pytest.raises(FaultyInput) as raised:
        change(study)
    assert str(raised.value).startswith(f"command line:1: {message}")

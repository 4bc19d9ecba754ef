"""The linear model behind the strengths, worked by hand."""

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from planner import read_study
from planner.linear import (
    LinearModel,
    largest_effect,
    linear_model,
    missing_strengths,
    outcome_explained,
)
from planner.study import Size, Study

STUDY = """\
effect: {treatment: x, outcome: y}
size: {records: 10}
variables:
  c: {per_unit: 1}
  x: {caused_by: {c: 0.2}, sd: 2, per_unit: 1}
  m: {caused_by: {x: 0.5}, per_unit: 1}
  y: {caused_by: {x: 0.3, m: -0.4, c: 0.3}, share: 0.2, per_unit: 1}
  late: {caused_by: [y, x], per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.16}]
"""
H = "hidden common cause of x and y"


@pytest.fixture
def study(write: Callable[..., Path]) -> Study:
    return read_study(write(STUDY))


def model_of(study: Study, size: Size) -> LinearModel:
    """The model at another size."""
    model = linear_model(replace(study, size=size), study.effects[0])
    assert model is not None
    return model


def test_the_effect_is_that_of_directed_paths_alone(study: Study) -> None:
    """0.3 straight and -0.5 · 0.4 by way of m; c and the hidden cause only make x and y alike."""
    model = model_of(study, Size(records=10))
    assert model.effect == pytest.approx(0.1)
    assert set(model.names) == {"c", "x", "m", "y", H}
    assert model.coefficients["y"] == {"x": 0.3, "m": -0.4, "c": 0.3, H: 0.4}
    # x 0.09, m 0.16, c 0.09, hidden 0.16, and twice the covariances: x with m 0.5, with c 0.2,
    # with the hidden cause 0.4; m half of those.
    twice = 2 * (-0.12 * 0.5 + 0.09 * 0.2 + 0.12 * 0.4 - 0.12 * 0.1 - 0.16 * 0.2)
    assert outcome_explained(model, "y") == pytest.approx(0.5 + twice)


def test_the_effect_to_be_detected_scales_what_carries_it(study: Study) -> None:
    """From 0.1 to 0.2: the arrows of x and m into y are doubled, all others stay."""
    model = model_of(study, Size(detect=0.2))
    assert model.effect == pytest.approx(0.2)
    assert model.coefficients["y"] == pytest.approx({"x": 0.6, "m": -0.8, "c": 0.3, H: 0.4})
    assert model.coefficients["m"] == {"x": 0.5}
    # Carried 4 · 0.13, alike 2 · 0.044, the rest 0.25.
    assert outcome_explained(model, "y") == pytest.approx(0.858)


def test_the_effect_keeps_its_sign(write: Callable[..., Path]) -> None:
    """0.3 - 0.5 · 0.8 = -0.1, so that 0.2 is detected as -0.2."""
    study = read_study(write(STUDY.replace("m: -0.4", "m: -0.8")))
    assert model_of(study, Size(records=10)).effect == pytest.approx(-0.1)
    assert model_of(study, Size(detect=0.2)).effect == pytest.approx(-0.2)


def test_natural_units_are_those_of_both_ends(study: Study) -> None:
    """A share of 0.2 has an SD of 0.4, x one of 2: 0.04 per unit of x are 0.2 SDs per SD."""
    assert model_of(study, Size(detect=0.04, in_units=True)).effect == pytest.approx(0.2)


def test_the_largest_effect_leaves_just_as_much_noise(study: Study) -> None:
    """The share is 0.9 where 0.13 f² + 0.044 f + 0.25 is: at f = 2.073 and an effect of 0.2073.

    So it is seen from any distance. Without x and m it is 0.25, and no effect leads below that.
    """
    (effect,) = study.effects
    for size in (Size(records=10), Size(detect=1e14)):
        largest = largest_effect(model_of(study, size), effect, 0.9)
        assert largest == pytest.approx(0.2073, abs=5e-5)
        assert outcome_explained(model_of(study, Size(detect=largest)), "y") == pytest.approx(0.9)
    assert largest_effect(model_of(study, Size(records=10)), effect, 0.25) is None


def test_strengths_below_the_outcome_are_not_needed(study: Study) -> None:
    assert missing_strengths(study, study.effects[0]) == []
    selected = replace(study, selected_by=("late",))
    assert missing_strengths(selected, study.effects[0]) == [("y", "late"), ("x", "late")]
    assert linear_model(selected, study.effects[0]) is None

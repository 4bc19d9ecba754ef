"""What is worth a second look before anything is searched."""

from collections.abc import Callable
from datetime import date
from pathlib import Path

import pytest

from planner import read_study
from planner.checking import summary_of

STUDY = """\
effect: {treatment: x, outcome: y}
size: {records: 10}
variables:
  x: {when: 1, per_unit: 1, needs: [visit]}
  y: {when: 2, caused_by: {x: 0.3}, per_unit: 1, needs: [visit]}
components:
  visit: {setup: 5}
"""
TODAY = date(2026, 12, 1)


def remarks(write: Callable[..., Path], text: str) -> tuple[str, ...]:
    """What is remarked on a study."""
    return summary_of(read_study(write(text)), TODAY).remarks


def test_a_study_in_figures(write: Callable[..., Path]) -> None:
    summary = summary_of(read_study(write(STUDY)), TODAY)
    assert summary.remarks == ()
    assert (summary.variables, summary.measurable, summary.arrows) == (2, 2, 1)
    assert (summary.arrows_with_strength, summary.ways, summary.components) == (1, 2, 1)
    assert (summary.timed, summary.times) == (2, ("1", "2"))


@pytest.mark.parametrize(
    ("edit", "remark"),
    [
        (
            ("size:", "tolerance: {bias: 0.15}\nsize:"),
            "tolerance.bias is not applied yet: plans are not checked for bias by poor readings.",
        ),
        (
            ("size:", "tolerance: {first_stage_F: 20}\nsize:"),
            "tolerance.first_stage_F is not applied yet: an instrument's strength is not checked.",
        ),
        (
            ("caused_by: {x: 0.3}, ", ""),
            "No directed path leads from x to y: by this diagram the effect is zero. Nine times in ten"
            " an arrow was forgotten.",
        ),
        (("components:", "  alone: {per_unit: 1}\ncomponents:"), "No arrow leads into or out of alone."),
        (
            ("visit: {setup: 5}", "visit: {setup: 5}\n  call: {always: yes, setup: 1, yields: 0.4}"),
            "'call' is always bought and yields 0.4, but x.standard, y.standard do not need it: paid for"
            " every unit started, also for those that are lost.",
        ),
        (("visit: {setup: 5}", "visit: {setup: 5}\n  idle: {setup: 1}"), "Nothing needs idle."),
        (
            ("size:", "tolerance: {least_reliability: 0.7}\nsize:", "needs: [visit]}\n  y", "reliability: 0.6}\n  y"),
            "No way of measuring x reaches a reliability of 0.7.",
        ),
        (
            ("size:", "default_strength: weak\nsize:", "{x: 0.3}", "[x]"),
            "1 arrow rests on the default strength.",
        ),
    ],
)  # fmt: skip
def test_a_second_look(edit: tuple[str, ...], remark: str, write: Callable[..., Path]) -> None:
    text = STUDY
    for old, new in zip(edit[::2], edit[1::2], strict=True):
        assert old in text
        text = text.replace(old, new)
    assert remark in remarks(write, text)


def test_prices_out_of_date_are_told(write: Callable[..., Path]) -> None:
    write("valid_until: 2026-11-30\ncomponents: {extra: {setup: 1, needs: [visit]}}\n", "p.yaml")
    assert "The prices in p.yaml were valid until 2026-11-30." in remarks(
        write, STUDY + "prices: p.yaml\n"
    )

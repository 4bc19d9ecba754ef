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
            ("size:", "tolerance: {bias: 0}\nsize:", "{x: 0.3}", "[x]"),
            "tolerance.bias cannot be applied: 1 strength is missing: x → y.",
        ),
        (
            ("size:", "tolerance: {first_stage_F: 15}\nsize:", "{x: 0.3}", "{x: 0.3, a: , b: , c: }", "  x:", "  a: {measurable: no}\n  b: {measurable: no}\n  c: {measurable: no}\n  x:",
             "components:", "hidden_common_causes: [[x, y]]\ncomponents:"),
            "tolerance.first_stage_F cannot be applied: 4 strengths are missing: (hidden common cause of"
            " x and y), a → y, b → y and 1 more.",
        ),
        (
            ("size: {records: 10}", "tolerance: {bias: 0.1, first_stage_F: 9}\nsize: {records: 10, confidence: 0.9}", "{x: 0.3}", "[x]"),
            "tolerance.bias and tolerance.first_stage_F and size.confidence cannot be applied: 1 strength"
            " is missing: x → y.",
        ),
        (
            ("{x: 0.3}", "{x: 0}"),
            "By the strengths the effect is zero: each directed path from x to y has an arrow of strength 0.",
        ),
        (
            ("{records: 10}", "{records: 10, confidence: 0.05}"),
            "size.confidence is 0.05: intervals would miss the effect more often than not. 0.95 is usual.",
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


@pytest.mark.parametrize(
    "edits",
    [
        # The strengths are known.
        ("size:", "tolerance: {bias: 0.15, first_stage_F: 20}\nsize:"),
        # A floor of 0 asks for nothing.
        ("size:", "tolerance: {first_stage_F: 0}\nsize:", "{x: 0.3}", "[x]"),
        # Nothing is asked for.
        ("{x: 0.3}", "[x]"),
    ],
)
def test_no_wish_is_left_unchecked(edits: tuple[str, ...], write: Callable[..., Path]) -> None:
    text = STUDY
    for old, new in zip(edits[::2], edits[1::2], strict=True):
        assert old in text
        text = text.replace(old, new)
    assert remarks(write, text) == ()


@pytest.mark.parametrize(
    ("size", "words", "records"),
    [
        ("records: 1400", "1,400 records", 1400),
        ("half_width: 0.05, confidence: 0.9", "half-width 0.05, confidence 0.9", None),
        ("detect: 0.12", "detect 0.12 with power 0.8", None),
        ("detect: 3, power: 0.9, in: units", "detect 3 with power 0.9, in natural units", None),
        ("detect: implied", "detect the effect that the strengths imply, with power 0.8", None),
        ("spend: 60000", "as narrow an interval as 60,000 EUR buys", None),
    ],
)
def test_the_size_is_told_in_words(
    size: str, words: str, records: int | None, write: Callable[..., Path]
) -> None:
    text = STUDY.replace("records: 10", size).replace("when: 1", "sd: 1, when: 1")
    text = text.replace("when: 2", "sd: 30, when: 2") + "currency: EUR\n"
    summary = summary_of(read_study(write(text)), TODAY)
    assert (summary.size, summary.records) == (words, records)


def test_the_implied_effect_is_that_of_the_strengths(write: Callable[..., Path]) -> None:
    """Also where another is to be detected; in natural units 0.3 SD is 0.3 · 30 / 2."""

    def effect(text: str) -> tuple[float | None, str]:
        summary = summary_of(read_study(write(text)), TODAY)
        return summary.effect, summary.effect_unit

    in_sds = "outcome SDs per treatment SD"
    assert effect(STUDY) == (0.3, in_sds)
    assert effect(STUDY.replace("records: 10", "detect: 0.1")) == (0.3, in_sds)
    assert effect(STUDY.replace("{x: 0.3}", "[x]")) == (None, in_sds)
    text = STUDY.replace("when: 1", "sd: 2, when: 1").replace("when: 2", "sd: 30, when: 2")
    assert effect(text.replace("records: 10", "records: 10, in: units")) == (
        pytest.approx(4.5),
        "natural units of the outcome per unit of the treatment",
    )


def test_prices_out_of_date_are_told(write: Callable[..., Path]) -> None:
    write("valid_until: 2026-11-30\ncomponents: {extra: {setup: 1, needs: [visit]}}\n", "p.yaml")
    assert "The prices in p.yaml were valid until 2026-11-30." in remarks(
        write, STUDY + "prices: p.yaml\n"
    )

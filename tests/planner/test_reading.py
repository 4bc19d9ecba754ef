"""Study files: what is read, and the whole message for each way to get it wrong."""

from collections.abc import Callable
from datetime import date
from fractions import Fraction
from pathlib import Path

import pytest

from costs.faults import FaultyInput
from costs.prices import Batch, Burden, Component, Way
from planner import read_study
from planner.study import ClusterDesign, Effect, HiddenCause, PriceSource, Range, Size, Tolerance
from tests.conftest import STUDY

EVERYTHING = """\
title: "Does it: really?"
unit: household
currency: EUR
effect: {treatment: NO, outcome: 012}
waves: [first, second]
variables:
  NO:
    label: a variable called NO
    definition: what it means
    measured_in: hours
    caused_by: {c: strong, d: [0.1, 0.2], u: }
    when: first
    share: 0.3
    care: yes
    per_unit: 1.2345
  012:
    caused_by: {NO: -weak, c: [-0.3, -0.1, 0]}
    when: second
    sd: 12.5
    ways:
      full: {label: all of it, per_unit: 1, setup: 2, batch: {holds: 38, price: 760}, needs: [base,
      kit],
             takes: {minutes: 1.25}, reliability: 0.9, yields: 0.8, care: TRUE, ask: How many?,
             answers: [one, two, many]}
      short: {needs: kit, heading: Block A, collected_by: nurse, source: file, note: none}
  c: {per_unit: 0, when: 0.5}
  d: {setup: 3}
  u: {measurable: no}
hidden_common_causes:
  - [c, d]
  - {of: [NO, d], strength: -0.1}
components:
  base: {always: yes, setup: 6000, per_unit: 0.10, yields: 0.35}
  kit: {setup: 3500, needs: [base]}
burdens:
  minutes: {limit: 30, price: 1.10}
  blood_ml: {label: blood, limit: 10, care: yes}
size: {records: 400, confidence: 0.9}
fieldwork: {usable: 0.8, design_effect: {conditioning: 1.3}, frame_size: 2500}
tolerance: {least_reliability: 0.6, bias: 0.15, first_stage_F: 20}
budget: 120000
overhead: 0.25
contingency: 0.05
default_strength: weak
routes: [mechanism, conditioning]
selected_by: [c]
"""


def faults_of(path: Path) -> str:
    """Every fault of a study, as its user sees them."""
    with pytest.raises(FaultyInput) as raised:
        read_study(path)
    return str(raised.value)


def test_every_key_is_read(write: Callable[..., Path]) -> None:
    study = read_study(write(EVERYTHING))
    assert study.title == "Does it: really?"
    assert (study.unit, study.currency) == ("household", "EUR")
    assert study.effects == (Effect(treatment="NO", outcome="012"),)
    assert study.waves == ("first", "second")
    treatment, outcome = study.variables["NO"], study.variables["012"]
    assert treatment.causes == {
        "c": Range(low=0.5, likely=0.5, high=0.5),
        "d": Range(low=0.1, likely=(0.1 + 0.2) / 2, high=0.2),
        "u": None,
    }
    assert outcome.causes["NO"] == Range(low=-0.1, likely=-0.1, high=-0.1)
    assert outcome.causes["c"] == Range(low=-0.3, likely=-0.1, high=0)
    assert (treatment.when, outcome.when, study.variables["c"].when) == (1, 2, Fraction(1, 2))
    assert (treatment.share, outcome.sd, treatment.care) == (0.3, 12.5, True)
    assert treatment.texts == {"definition": "what it means", "measured_in": "hours"}
    assert study.prices.ways["NO"] == {"standard": Way(per_unit=Fraction("1.2345"))}
    assert study.prices.ways["012"]["full"] == Way(
        label="all of it",
        per_unit=Fraction(1),
        setup=Fraction(2),
        batch=Batch(holds=38, price=Fraction(760)),
        needs=("base", "kit"),
        takes={"minutes": Fraction("1.25")},
        reliability=Fraction("0.9"),
        yields=Fraction("0.8"),
        care=True,
        texts={"ask": "How many?", "answers": "one; two; many"},
    )
    assert study.prices.ways["012"]["short"].texts == {
        "heading": "Block A",
        "collected_by": "nurse",
        "source": "file",
        "note": "none",
    }
    assert "u" not in study.prices.ways
    assert study.hidden_causes == (
        HiddenCause(of=("c", "d"), name="hidden common cause of c and d"),
        HiddenCause(
            of=("NO", "d"),
            name="hidden common cause of NO and d",
            strength=Range(low=-0.1, likely=-0.1, high=-0.1),
        ),
    )
    assert study.prices.components["base"] == Component(
        always=True, setup=Fraction(6000), per_unit=Fraction("0.1"), yields=Fraction("0.35")
    )
    assert study.terms.burdens == {
        "minutes": Burden(limit=Fraction(30), price=Fraction("1.1")),
        "blood_ml": Burden(label="blood", limit=Fraction(10), care=True),
    }
    assert study.size == Size(records=400, confidence=0.9)
    assert (study.terms.records, study.terms.usable) == (400, Fraction("0.8"))
    assert (study.terms.overhead, study.terms.contingency) == (Fraction(1, 4), Fraction(1, 20))
    assert (study.budget, study.frame_size) == (120_000, 2500)
    assert study.design_effect == {"conditioning": 1.3}
    assert study.tolerance == Tolerance(
        least_reliability=Fraction("0.6"), bias=Fraction("0.15"), first_stage_f=Fraction(20)
    )
    assert study.default_strength == Range(low=0.1, likely=0.1, high=0.1)
    assert study.routes == ("conditioning", "mechanism")
    assert study.selected_by == ("c",)
    assert study.digest.startswith("sha256:")


@pytest.mark.parametrize(
    ("text", "effect"),
    [
        ("design_effect: 1.2", 1.2),
        (
            "clusters: {holds: 20, icc: {treatment: 0.3, outcome: 0.05}}",
            ClusterDesign(holds=20, icc_treatment=0.3, icc_outcome=0.05),
        ),
        (
            "design_effect: {clusters: {holds: 5, icc: {treatment: 0, outcome: 1}}}",
            ClusterDesign(holds=5, icc_treatment=0, icc_outcome=1),
        ),
    ],
)
def test_design_effects_take_three_forms(
    text: str, effect: object, write: Callable[..., Path]
) -> None:
    assert read_study(write(f"{STUDY}fieldwork: {{{text}}}\n")).design_effect == effect


SIZED = """\
effect: {treatment: x, outcome: y}
size: {detect: implied}
variables:
  x: {caused_by: {c: 0.2}, sd: 2, per_unit: 1}
  m: {caused_by: {x: 0.5}, per_unit: 1}
  y: {caused_by: {x: 0.3, m: -0.4, c: 0.3}, share: 0.2, per_unit: 1}
  c: {per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.16}]
"""
"""Every strength is given; the effect is 0.3 - 0.5 · 0.4 = 0.1."""


@pytest.mark.parametrize(
    ("text", "size"),
    [
        ("records: 40", Size(records=40)),
        ("half_width: 0.05, confidence: 0.9", Size(half_width=0.05, confidence=0.9)),
        ("detect: 0.12, power: 0.9", Size(detect=0.12, power=0.9)),
        ("detect: 0.02, in: units", Size(detect=0.02, in_units=True)),
        ("detect: implied, power: 0.0251", Size(implied=True, power=0.0251)),
        ("spend: 60000.0001", Size(spend=Fraction("60000.0001"))),
        ("spend: 0", Size(spend=Fraction(0))),
    ],
)
def test_sizes_take_four_forms(text: str, size: Size, write: Callable[..., Path]) -> None:
    study = read_study(write(SIZED.replace("{detect: implied}", f"{{{text}}}")))
    assert study.size == size
    assert study.terms.records == (size.records or 1)
    assert study.size.is_target == (size.records is None)


UNSIZED = {
    "paths that cancel": (
        ("x: 0.3, m: -0.4", "x: 0.2, m: -0.4"),
        "study.yaml:2: size.detect: finds no effect to size for: the directed paths from x to y"
        " cancel.\n    Correct the strengths along these paths, or size the study by its records, as"
        " in 'size: {records: 400}'.",
    ),
    "paths that lead nowhere": (
        ("x: 0.3, m: -0.4", "x: 0, m: 0", "detect: implied", "spend: 9"),
        "study.yaml:2: size.spend: finds no effect to size for: each directed path from x to y has an"
        " arrow of strength 0.\n    Correct the strengths along these paths, or size the study by its"
        " records, as in 'size: {records: 400}'.",
    ),
    # Three times the effect: 9 · 0.13 + 3 · 0.044 + 0.25; the share is 1 at 2.2387 times 0.1.
    "too large an effect": (
        ("detect: implied", "detect: 0.3"),
        "study.yaml:2: size.detect: is an effect with which 'y' is explained to 155.2 % by its causes;"
        " less than 100 % is possible.\n    Write 0.223 or less.",
    ),
    # A probability of 0.2 has an SD of 0.4, x one of 2: 0.3 outcome SDs per SD are 0.06.
    "too large an effect in units": (
        ("detect: implied", "detect: 0.06, in: units"),
        "study.yaml:2: size.detect: is an effect with which 'y' is explained to 155.2 % by its causes;"
        " less than 100 % is possible.\n    Write 0.0447 or less.",
    ),
    # What c explains alone, 1.21, is too much: it takes an effect against it to leave noise.
    "too small an effect": (
        (
            "detect: implied",
            "detect: 0.1",
            "{c: 0.2}",
            "{c: 0.8}",
            "x: 0.3, m: -0.4, c: 0.3",
            "x: -0.5, c: 1.1",
            "strength: 0.16",
            "strength: 0",
        ),
        "study.yaml:2: size.detect: is an effect with which 'y' is explained to 104.4 % by its causes;"
        " less than 100 % is possible.\n    Write 'detect: implied', or correct the strengths.",
    ),
    "strengths at fault are told of alone": (
        ("detect: implied", "detect: 3", "m: -0.4", "m: -1.4"),
        "study.yaml:6: variables.y: is explained to 170.4 % by its causes; less than 100 % is"
        " possible.\n    Multiply the strengths of all arrows into it by 0.766 or less.",
    ),
    "strengths missing in numbers": (
        (
            "{c: 0.2}",
            f"[{', '.join(f'v{i}' for i in range(14))}]",
            "  c:",
            "".join(f"  v{i}: {{measurable: no}}\n" for i in range(14)) + "  c:",
        ),
        "study.yaml:2: size.detect: cannot be worked out: 14 strengths are missing: v0 → x, v1 → x, v2 → x,"
        " v3 → x, v4 → x, v5 → x, v6 → x, v7 → x, v8 → x, v9 → x, v10 → x, v11 → x and 2 more.\n"
        "    Give each a strength in 'caused_by' or 'hidden_common_causes', write 'default_strength:"
        " weak', or size the study by its records, as in 'size: {records: 400}'.",
    ),
}


@pytest.mark.parametrize("name", UNSIZED)
def test_a_size_that_cannot_be_worked_out_says_why(name: str, write: Callable[..., Path]) -> None:
    edits, message = UNSIZED[name]
    text = SIZED
    for old, new in zip(edits[::2], edits[1::2], strict=True):
        assert old in text
        text = text.replace(old, new)
    assert faults_of(write(text)) == message


def test_the_largest_effect_that_is_named_fits(write: Callable[..., Path]) -> None:
    for text in ("detect: 0.223", "detect: 0.0447, in: units"):
        assert read_study(write(SIZED.replace("detect: implied", text))).size.detect


@pytest.mark.parametrize(
    "edits",
    [
        # No strength hangs on them: neither y nor m comes before x, and m is on no path.
        ("m: -0.4, ", "", "m: {caused_by: {x: 0.5}", "m: {caused_by: [x]"),
        # Without a directed path the effect is zero, and there is no other answer.
        ("x: 0.3, m: -0.4, c: 0.3", "c: "),
        # Selection after the treatment leaves no route to it.
        ("{x: 0.5}", "[x]", "hidden", "selected_by: m\nhidden"),
    ],
)
def test_strengths_are_missed_only_where_an_answer_hangs_on_them(
    edits: tuple[str, ...], write: Callable[..., Path]
) -> None:
    text = SIZED
    for old, new in zip(edits[::2], edits[1::2], strict=True):
        assert old in text
        text = text.replace(old, new)
    assert read_study(write(text)).size.implied


def test_a_default_serves_at_a_target(write: Callable[..., Path]) -> None:
    text = SIZED.replace("{c: 0.2}", "[c]").replace(", strength: 0.16", "")
    assert read_study(write(f"{text}default_strength: weak\n")).size.implied


def test_what_is_left_out_has_its_default(write: Callable[..., Path]) -> None:
    text = STUDY.replace("title: Does a call help?\n", "").replace("currency: EUR\n", "")
    study = read_study(write(text))
    assert study.title == "What is the effect of x on y?"
    assert (study.unit, study.currency) == ("unit", "")
    assert study.routes == ("conditioning", "instrument", "mechanism")
    assert study.budget is None
    assert study.frame_size is None
    assert study.terms.usable == 1


MESSAGES = {
    "a circle is spelt out": (
        ("c: {per_unit: 2", "c: {caused_by: [y], per_unit: 2"),
        "study.yaml:7: variables.x.caused_by: closes a circle: c → x → y → c.\n"
        "    A cause cannot follow from its effect: take one of these arrows out.",
    ),
    "an unknown cause": (
        ("caused_by: [c]", "caused_by: [cc]"),
        "study.yaml:7: variables.x.caused_by: names the cause 'cc', which is no variable.\n"
        "    Did you mean 'c'?",
    ),
    "a repeated key": (
        ("    per_unit: 1\n", "    per_unit: 1\n    per_unit: 2\n"),
        "study.yaml:9: variables.x.per_unit: stands here again, after line 8.\n"
        "    Keep one of the two.",
    ),
    "a repeated variable": (
        ("  c: {per_unit", "  x: {per_unit: 0}\n  c: {per_unit"),
        "study.yaml:13: variables.x: stands here again, after line 6.\n    Keep one of the two.",
    ),
    "a missing price": (
        ("    per_unit: 1\n", "    reliability: 0.8\n"),
        "study.yaml:7: variables.x: has no price.\n"
        "    Write 'per_unit: 0' if it costs nothing, else any of per_unit, setup, batch, needs.",
    ),
    "neither a way nor the word": (
        ("c: {per_unit: 2, needs: [visit]}", "c: {label: see}"),
        "study.yaml:13: variables.c: has no price and no way of measuring.\n"
        "    Give it 'per_unit' (0 if free), list it under 'prices', or write 'measurable: no'.",
    ),
    "a way and the word": (
        ("c: {per_unit: 2,", "c: {measurable: no, per_unit: 2,"),
        "study.yaml:13: variables.c: has a way of measuring, but says 'measurable: no'.\n"
        "    Take one of the two out.",
    ),
    "components in a circle": (
        ("visit: {setup: 10}", "visit: {needs: [tube]}\n  tube: {needs: [visit]}"),
        "study.yaml:16: components.tube: needs itself: tube needs visit needs tube.\n"
        "    Take one of these needs out.",
    ),
    "a negative price": (
        ("per_unit: 0.50", "per_unit: -0.50"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is '-0.50', but must be 0 or more.\n"
        "    Write a number that is 0 or more.",
    ),
    "no number": (
        ("per_unit: 0.50", "per_unit: .nan"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is '.nan', which is no number.\n"
        "    Write it like 12.50.",
    ),
    "a decimal comma": (
        ("per_unit: 0.50", "per_unit: '0,50'"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is '0,50', which is no number.\n"
        "    Write it like 12.50.",
    ),
    "a formula": (
        ("per_unit: 0.50", "per_unit: =1+2"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is the formula '=1+2', and none is computed.\n"
        "    Write the number itself.",
    ),
    "a huge number": (
        ("per_unit: 0.50", "per_unit: 1e99"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is '1e99', which is too large to be meant.\n"
        "    Write a number below 10^15.",
    ),
    "too many decimals": (
        ("per_unit: 0.50", "per_unit: 0.12345"),
        "study.yaml:12: variables.y.ways.ask.per_unit: is '0.12345', with more than 4 decimals.\n"
        "    Round it to 4 decimals.",
    ),
    "a burden with too many decimals": (
        ("minutes: 2}", "minutes: 2.125}"),
        "study.yaml:12: variables.y.ways.ask.takes.minutes: is '2.125', with more than 2 decimals.\n"
        "    Round it to 2 decimals.",
    ),
    "an unknown burden": (
        ("minutes: 2}", "minute: 2}"),
        "study.yaml:12: variables.y.ways.ask.takes.minute: names the burden 'minute', which is not"
        " there.\n    Did you mean 'minutes'?",
    ),
    "an unknown component": (
        ("needs: [visit]", "needs: [visits]"),
        "study.yaml:13: variables.c.needs: names the component 'visits', which is not there.\n"
        "    Did you mean 'visit'?",
    ),
    "a treatment that cannot be measured": (
        ("    per_unit: 1\n", "    measurable: no\n"),
        "study.yaml:3: effect.treatment: 'x' is the treatment, and cannot be measured.\n"
        "    Give it a way of measuring: no study can do without.",
    ),
    "an unknown outcome": (
        ("outcome: y", "outcome: yy"),
        "study.yaml:3: effect.outcome: names the variable 'yy', which is not there.\n"
        "    Did you mean 'y'?",
    ),
    "one variable as both": (
        ("outcome: y", "outcome: x"),
        "study.yaml:3: effect: names one variable as treatment and as outcome.\n"
        "    Name two variables.",
    ),
    "an unknown key": (
        ("currency: EUR", "curency: EUR"),
        "study.yaml:2: curency: is not a known key.\n    Did you mean 'currency'?",
    ),
    "the key cost": (
        ("per_unit: 0.50", "per_unit: 0.50, cost: 3"),
        "study.yaml:12: variables.y.ways.ask.cost: is not a known key.\n"
        "    Write 'per_unit' for a price per unit, or 'setup' for a price paid once.",
    ),
    "a key kept for later": (
        ("size:", "spare: yes\nsize:"),
        "study.yaml:4: spare: is reserved: its meaning is fixed, but it cannot be used yet.\n"
        "    Leave it out for now.",
    ),
    "a way's key kept for later": (
        ("per_unit: 0.50", "per_unit: 0.50, on: 0.25"),
        "study.yaml:12: variables.y.ways.ask.on: is reserved: its meaning is fixed, but it cannot be"
        " used yet.\n    Leave it out for now.",
    ),
    "two sizes": (
        ("{records: 40}", "{half_width: 0.1, records: 40, spend: 9}"),
        "study.yaml:4: size.records: stands beside 'half_width', which sizes the study already.\n"
        "    Keep one of the two.\n"
        "study.yaml:4: size.spend: stands beside 'half_width', which sizes the study already.\n"
        "    Keep one of the two.",
    ),
    "a size that says nothing": (
        ("{records: 40}", "{power: 0.8}"),
        "study.yaml:4: size: does not say how large the study is to be.\n"
        "    Write 'size: {records: 400}', or {half_width: 0.05}, {detect: 0.12, power: 0.8} or"
        " {spend: 60000}.",
    ),
    "a size without a name": (
        ("{records: 40}", "40"),
        "study.yaml:4: size: is '40', where 'name: …' entries are wanted.\n"
        "    Write one entry a line, indented below.",
    ),
    "power with nothing to detect": (
        ("{records: 40}", "{half_width: 0.1, power: 0.8}"),
        "study.yaml:4: size.power: goes with 'detect' only.\n"
        "    Leave it out, or size the study by an effect to detect in place of 'half_width'.",
    ),
    "power that takes no study": (
        ("{records: 40}", "{detect: 0.1, confidence: 0.9, power: 0.05}"),
        "study.yaml:4: size.power: is '0.05', but chance alone detects with 0.05 at a confidence of"
        " 0.9.\n    Write a number that is above 0.05.",
    ),
    "numbers of a size out of bounds": (
        ("{records: 40}", "{half_width: 0, confidence: 95, in: cm}"),
        "study.yaml:4: size.half_width: is '0', but must be above 0.\n"
        "    Write a number that is above 0.\n"
        "study.yaml:4: size.confidence: is '95', but must be below 1.\n"
        "    Write a number that is below 1.\n"
        "study.yaml:4: size.in: is 'cm'.\n"
        "    Known here: units.",
    ),
    "an effect with a sign": (
        ("{records: 40}", "{detect: -0.1, power: 1}"),
        "study.yaml:4: size.detect: is '-0.1', but must be above 0.\n"
        "    Write a number that is above 0.\n"
        "study.yaml:4: size.power: is '1', but must be below 1.\n"
        "    Write a number that is below 1.",
    ),
    "an effect in an unknown word": (
        ("{records: 40}", "{detect: implyed}"),
        "study.yaml:4: size.detect: is 'implyed'.\n    Did you mean 'implied'?",
    ),
    "an effect left empty": (
        ("{records: 40}", "{detect: }"),
        "study.yaml:4: size.detect: is empty, where a number is wanted.\n    Write it like 12.50.",
    ),
    "money with too many decimals": (
        ("{records: 40}", "{spend: 0.00001}"),
        "study.yaml:4: size.spend: is '0.00001', with more than 4 decimals.\n"
        "    Round it to 4 decimals.",
    ),
    "natural units without an SD": (
        ("records: 40}", "records: 40, in: units}"),
        "study.yaml:4: size.in: asks for natural units, but 'x' and 'y' have neither 'sd' nor"
        " 'share'.\n    Write 'sd: 12.5' there, or 'share: 0.3' for a yes/no variable.",
    ),
    "natural units of one end": (
        ("{records: 40}", "{records: 0, in: units}", "  x:\n", "  x:\n    share: 0.3\n"),
        "study.yaml:4: size.records: is '0', but must be 1 or more.\n"
        "    Write a number that is 1 or more.\n"
        "study.yaml:4: size.in: asks for natural units, but 'y' has neither 'sd' nor 'share'.\n"
        "    Write 'sd: 12.5' there, or 'share: 0.3' for a yes/no variable.",
    ),
    "an SD at fault is told once": (
        (
            "{records: 40}",
            "{records: 4, in: units}",
            "  x:\n",
            "  x:\n    sd: 1\n",
            "  y:\n",
            "  y:\n    sd: 0\n",
        ),
        "study.yaml:11: variables.y.sd: is '0', but must be above 0.\n"
        "    Write a number that is above 0.",
    ),
    "a target without strengths": (
        (
            "{records: 40}",
            "{half_width: 0.1}",
            "c: -0.2}",
            "c: -0.2, d: }",
            "size:",
            "hidden_common_causes: [[x, c]]\nsize:",
            "  c: {",
            "  d: {measurable: no}\n  c: {",
        ),
        "study.yaml:5: size.half_width: cannot be worked out: 3 strengths are missing: c → x, (hidden"
        " common cause of x and c), d → y.\n"
        "    Give each a strength in 'caused_by' or 'hidden_common_causes', write 'default_strength:"
        " weak', or size the study by its records, as in 'size: {records: 400}'.",
    ),
    "other faults come before a target's": (
        ("{records: 40}", "{half_width: 0.1}", "limit: 20", "limit: many"),
        "study.yaml:17: burdens.minutes.limit: is 'many', which is no number.\n"
        "    Write it like 12.50.",
    ),
    "half a record": (
        ("records: 40}", "records: 40.5}"),
        "study.yaml:4: size.records: is '40.5', but must be a whole number.\n"
        "    Write a whole number, such as 40.",
    ),
    "too many records": (
        ("records: 40}", "records: 2000000000}"),
        "study.yaml:4: size.records: is '2000000000', but must be 1000000000 or less.\n"
        "    Write a number that is 1000000000 or less.",
    ),
    "no size": (
        ("size: {records: 40}\n", ""),
        "study.yaml:1: size: is missing.\n"
        "    Write 'size: {records: 400}', or {half_width: 0.05}, {detect: 0.12, power: 0.8} or"
        " {spend: 60000}.",
    ),
    "a cause after its effect": (
        ("  x:\n", "  x:\n    when: 2\n", "  y:\n", "  y:\n    when: 1\n"),
        "study.yaml:12: variables.y.caused_by.x: 'x' (when: 2) comes later than 'y' (when: 1), which"
        " follows from it.\n    Correct one of the two times, or turn an arrow round.",
    ),
    "a wave that is not there": (
        ("  x:\n", "  x:\n    when: third\n", "size:", "waves: [first, second]\nsize:"),
        "study.yaml:8: variables.x.when: names the wave 'third', which is not there.\n"
        "    Known here: first, second.",
    ),
    "explained by more than everything": (
        ("{x: 0.3, c: -0.2}", "{x: 0.8, c: 0.7}", "[c]", "{c: 0.0}"),
        "study.yaml:10: variables.y: is explained to 113.0 % by its causes; less than 100 % is"
        " possible.\n    Multiply the strengths of all arrows into it by 0.94 or less.",
    ),
    "no strength": (
        ("{x: 0.3,", "{x: mighty,"),
        "study.yaml:10: variables.y.caused_by.x: is 'mighty', which is no strength.\n"
        "    Known here: weak, moderate, strong.",
    ),
    "a range that runs down": (
        ("{x: 0.3,", "{x: [0.3, 0.1],"),
        "study.yaml:10: variables.y.caused_by.x: is a range that does not run upwards.\n"
        "    Write the lowest value first.",
    ),
    "a hidden cause of three": (
        ("size:", "hidden_common_causes: [[x, y, c]]\nsize:"),
        "study.yaml:4: hidden_common_causes: does not name two variables.\n"
        "    Write it like [first, second].",
    ),
    "a hidden cause twice": (
        ("size:", "hidden_common_causes:\n  - [x, y]\n  - [y, x]\nsize:"),
        "study.yaml:6: hidden_common_causes: gives a hidden common cause of y and x again.\n"
        "    Keep one of the two.",
    ),
    "an unknown route": (
        ("size:", "routes: [conditionning]\nsize:"),
        "study.yaml:4: routes: names the route 'conditionning', which is not there.\n"
        "    Did you mean 'conditioning'?",
    ),
    "a share of nothing": (
        ("size:", "fieldwork: {usable: 0}\nsize:"),
        "study.yaml:4: fieldwork.usable: is '0', but must be above 0.\n"
        "    Write a number that is above 0.",
    ),
    "maybe": (
        ("visit: {setup: 10}", "visit: {setup: 10, always: maybe}"),
        "study.yaml:15: components.visit.always: is 'maybe', where yes or no is wanted.\n"
        "    Write yes or no.",
    ),
    "own keys beside ways": (
        ("    ways:\n      ask", "    per_unit: 3\n    ways:\n      ask"),
        "study.yaml:11: variables.y.per_unit: stands beside 'ways'.\n"
        "    Move it into one of the ways.",
    ),
    "a batch without a size": (
        ("per_unit: 0.50", "batch: {price: 3}"),
        "study.yaml:12: variables.y.ways.ask.batch: lacks 'holds'.\n"
        "    Write it like {holds: 38, price: 760}.",
    ),
    "a Python tag": (
        ("title: Does a call help?", "title: !!python/name:os.system x"),
        "study.yaml:1: file: carries the tag '!!python/name:os.system': a study is data, never code.\n"
        "    Leave the tag out.",
    ),
    "an alias of nothing": (
        ("needs: [visit]", "needs: *gone"),
        "study.yaml:13: file: uses '*gone', which stands for nothing before it.\n"
        "    Write the value itself.",
    ),
    "an open bracket": (
        ("[visit]", "[visit"),
        "study.yaml:13: file: is no YAML here: did not find expected ',' or ']'.\n"
        "    Look at this line and the one above: indentation, a missing colon, an open quote or"
        " bracket.",
    ),
    "amounts too large to count": (
        ("setup: 10}", "setup: 999999999999999}", "per_unit: 0.50", "per_unit: 0.0001"),
        "study.yaml:15: components.visit: is too dear to be added up exactly: all amounts together"
        " reach 2^60 times 0.0001, the largest amount of money that divides them all.\n"
        "    Lower prices or losses, or the number of records, or count in a larger unit of money.",
    ),
}


@pytest.mark.parametrize("name", MESSAGES)
def test_a_fault_says_what_where_and_how_to_mend_it(name: str, write: Callable[..., Path]) -> None:
    edits, message = MESSAGES[name]
    text = STUDY
    for old, new in zip(edits[::2], edits[1::2], strict=True):
        assert old in text
        text = text.replace(old, new)
    assert faults_of(write(text)) == message


def test_all_faults_are_told_at_once_and_by_line(write: Callable[..., Path]) -> None:
    text = (
        STUDY.replace("caused_by: [c]", "caused_by: [cc]")
        .replace("outcome: y", "outcome: z")
        .replace("limit: 20", "limit: many")
        .replace("per_unit: 2", "per_unit: two")
    )
    told = faults_of(write(text)).splitlines()[::2]
    assert [line.split(": ")[0] for line in told] == [
        "study.yaml:3",
        "study.yaml:7",
        "study.yaml:13",
        "study.yaml:17",
    ]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "study.yaml:1: file: is empty."),
        (b"# nothing\n", "study.yaml:1: file: is empty."),
        (b"title: caf\xe9\n", "study.yaml:1: file: is not written in UTF-8."),
        (b"a: 1\nb: \xff\n", "study.yaml:2: file: is not written in UTF-8."),
        (
            b"[a, b]\n",
            "study.yaml:1: file: is a list, where 'name: \xe2\x80\xa6' entries are wanted.",
        ),
        (
            b"hello\n",
            "study.yaml:1: file: is 'hello', where 'name: \xe2\x80\xa6' entries are wanted.",
        ),
        (b"a: 1\n---\nb: 2\n", "study.yaml:2: file: holds a second document, after '---'."),
        (b"a: \x00\n", "study.yaml:1: file: is no YAML here: control characters are not allowed."),
        (
            b"a: " + b"[" * 100_000,
            "study.yaml:1: file: is no YAML here: exceeded maximum nesting depth.",
        ),
    ],
)
def test_a_file_that_is_no_study_is_refused(
    content: bytes, message: bytes | str, write: Callable[..., Path]
) -> None:
    wanted = message.encode("latin-1").decode() if "\xe2" in message else message
    assert faults_of(write(content)).splitlines()[0] == wanted


def test_aliases_are_read_but_not_blown_up(write: Callable[..., Path]) -> None:
    shared = STUDY.replace("needs: [visit]", "needs: &all [visit]").replace(
        "    per_unit: 1\n", "    needs: *all\n"
    )
    # An alias can only repeat what stands before it, so the two change places.
    before = shared.replace("&all [visit]", "*all").replace(
        "needs: *all\n", "needs: &all [visit]\n", 1
    )
    assert read_study(write(before)).prices.ways["c"]["standard"].needs == ("visit",)
    layers = [f"l{i}: &l{i} [{', '.join([f'*l{i - 1}'] * 9)}]" for i in range(1, 12)]
    bomb = "\n".join(["l0: &l0 [x, x]", *layers, STUDY])
    assert faults_of(write(bomb)).splitlines()[0] == (
        "study.yaml:1: file: stands for 110,324,037,761 values; at most 50,000 are read."
    )


def test_paths_that_are_no_files_are_refused(write: Callable[..., Path], tmp_path: Path) -> None:
    write(STUDY)
    (tmp_path / "folder.yaml").mkdir()
    assert faults_of(Path("missing.yaml")).startswith(
        "missing.yaml:1: file: there is no such file."
    )
    assert faults_of(Path("folder.yaml")).startswith(
        "folder.yaml:1: file: is a folder, not a file."
    )
    big = write(b"#" * 10_000_001, "big.yaml")
    assert faults_of(big).startswith("big.yaml:1: file: is larger than 10 MB.")


def test_hidden_causes_count_for_what_is_explained(write: Callable[..., Path]) -> None:
    """A hidden common cause of x and y of strength 0.81 loads 0.9 on each: 0.81 + 0.3² + 2·0.9·0.3·0.9."""
    text = STUDY.replace("[c]", "{c: 0}").replace("c: -0.2", "c: 0")
    text += "hidden_common_causes: [{of: [x, y], strength: 0.81}]\n"
    assert "variables.y: is explained to 138.6 % by its causes" in faults_of(write(text))


def test_a_large_study_is_read_without_adding_up_everything(
    write: Callable[..., Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("planner.strengths.MOST_COVARIANCES", 100)
    base = "".join(f"  v{i}: {{per_unit: 1}}\n" for i in range(8))
    more = "".join(
        f"  v{i}: {{caused_by: {{v{i - 1}: 0.5, v{i // 2}: 0.2}}, per_unit: 1}}\n"
        for i in range(8, 60)
    )
    study = read_study(write(STUDY.replace("components:", f"{base}{more}components:")))
    assert 0 < study.unchecked_strengths < 52


# ------------------------------------------------------------------------------------ price lists


def test_price_lists_add_to_the_study(write: Callable[..., Path]) -> None:
    write(
        "currency: EUR\nvalid_until: 2026-12-31\nways: {c: {file: {per_unit: 1}}}\n"
        "components: {tube: {setup: 5}}\n",
        "more.yaml",
    )
    write("variable,per_unit,needs\nx,2,tube\n", "x.csv")
    text = STUDY.replace("    per_unit: 1\n", "") + "prices: [more.yaml, x.csv]\n"
    study = read_study(write(text))
    assert study.prices.ways["x"] == {"standard": Way(per_unit=Fraction(2), needs=("tube",))}
    assert list(study.prices.ways["c"]) == ["standard", "file"]
    assert [source.path for source in study.price_sources] == ["more.yaml", "x.csv"]
    assert study.price_sources[0] == PriceSource(
        path="more.yaml", digest=study.price_sources[0].digest, valid_until=date(2026, 12, 31)
    )


@pytest.mark.parametrize(
    ("more", "message"),
    [
        (
            "currency: USD\n",
            "more.yaml:1: currency: is 'USD', but the study counts in 'EUR'.\n"
            "    Convert the prices, or correct the currency.",
        ),
        (
            "ways: {cc: {file: {per_unit: 1}}}\n",
            "more.yaml:1: ways.cc.file: measures 'cc', which is no variable of the study.\n"
            "    Did you mean 'c'?",
        ),
        (
            "ways: {c: {standard: {per_unit: 1}}}\n",
            "more.yaml:1: ways.c.standard: gives the same way again, after study.yaml:13.\n"
            "    Keep one of the two.",
        ),
        (
            "valid_until: soon\n",
            "more.yaml:1: valid_until: is 'soon', which is no date.\n    Write it like 2026-12-31.",
        ),
        ("", "more.yaml:1: file: is empty.\n    'measurewise new' writes a study to fill in."),
    ],
)
def test_faults_of_a_price_list_name_its_own_lines(
    more: str, message: str, write: Callable[..., Path]
) -> None:
    write(more, "more.yaml")
    assert faults_of(write(STUDY + "prices: more.yaml\n")) == message


def test_price_lists_can_be_put_in_place_of_the_studys(write: Callable[..., Path]) -> None:
    write("variable,per_unit\nx,2\n", "old.csv")
    write("variable,per_unit\nx,3\n", "new.csv")
    text = STUDY.replace("    per_unit: 1\n", "") + "prices: old.csv\n"
    study = read_study(write(text), prices=["new.csv"])
    assert study.prices.ways["x"]["standard"].per_unit == 3


def test_no_file_is_opened_that_was_not_named(write: Callable[..., Path]) -> None:
    message = faults_of(write(STUDY + "prices: [gone.csv, list.txt]\n"))
    assert message.splitlines()[::2] == [
        "gone.csv:1: file: there is no such file.",
        "list.txt:1: file: is no price list of a known kind.",
    ]

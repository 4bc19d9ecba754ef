"""The report on a terminal: whole pages that a person has read, and what no name may break.

After a change that is meant, ``pytest --update-golden`` writes the pages anew; read them before
they are committed.
"""

from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path

import pytest

from planner import read_study, recommend
from planner.report.answers import proof
from planner.study import Size
from tests.conftest import EXAMPLES, ROOT, Ran

GOLDEN = ROOT / "tests" / "golden"
BEYOND = """\
title: What would it take?
effect: {treatment: x, outcome: y}
size: {records: 10}
budget: 30
currency: EUR
variables:
  x: {caused_by: [c], per_unit: 1, care: yes}
  y: {caused_by: [x, c], per_unit: 1, yields: 0.5}
  c: {per_unit: 8}
"""
PAGES = {path.stem: path for path in EXAMPLES} | {"beyond_the_limits": None}


@pytest.mark.parametrize("name", PAGES)
def test_pages_are_as_they_were_read(
    name: str,
    run: Callable[..., Ran],
    write: Callable[..., Path],
    request: pytest.FixtureRequest,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    page = run("recommend", PAGES[name] or write(BEYOND)).out
    golden = GOLDEN / f"{name}.txt"
    if request.config.getoption("--update-golden"):
        golden.write_text(page, encoding="utf-8")
    assert page == golden.read_text(encoding="utf-8")
    assert max(map(len, page.splitlines())) <= 80
    assert not any(line != line.rstrip() for line in page.splitlines())


NAMES = [
    "[bold]x[/bold]",
    "<script>alert(1)</script>",
    "naïve ☕ 👩‍🔬",
    "מדד",
    "{0} %s \\n",
    "x" * 200,
]


@pytest.mark.parametrize("name", NAMES)
def test_names_are_shown_as_they_are(
    name: str, run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    """Text of the user is no markup, no format and no reason to fail."""
    quoted = "'" + name + "'"
    path = write(
        f"title: {quoted}\neffect: {{treatment: {quoted}, outcome: y}}\nsize: {{records: 10}}\n"
        f"variables:\n  {quoted}: {{caused_by: [c], per_unit: 1, label: {quoted}}}\n"
        f"  y: {{caused_by: [c, {quoted}], per_unit: 1}}\n  c: {{per_unit: 1}}\n"
    )
    for words in (("recommend", path), ("recommend", path, "--json"), ("check", path)):
        ran = run(*words)
        assert ran.code == 0
        assert name in "".join(ran.out.split("\n")).replace(" ", "").replace("\\\\", "\\") or (
            name.replace(" ", "") in "".join(ran.out.split()).replace("\\\\", "\\")
        )


def test_the_answer_comes_first(run: Callable[..., Ran]) -> None:
    page = run("recommend", ROOT / "examples" / "permits.yaml").out
    headings = [line for line in page.splitlines() if line.isupper() and not line.startswith(" ")]
    assert headings == [
        "ANSWER",
        "WHAT THE PRICE LEANS ON",
        "THE ROUTES SIDE BY SIDE",
        "WHAT TO BUY",
        "DO NOT ADJUST FOR",
        "THE BILL",
        "WHY EACH ROUTE IS OPEN OR NOT, AND WHAT IT LEANS ON",
        "MEASURABLE, BUT NOT NEEDED",
        "ALSO GOOD TO KNOW",
    ]


SIZED = """\
title: Does it help?
currency: EUR
effect: {treatment: x, outcome: y}
size: {detect: implied, power: 0.8}
tolerance: {bias: 0.2}
variables:
  x: {caused_by: {c: 0.5, z: 0.4}, per_unit: 1, needs: [visit], sd: 2, measured_in: hours}
  m: {caused_by: {x: 0.5}, per_unit: 4, reliability: 0.9}
  y: {caused_by: {m: 0.5, c: 0.3, e: 0.5}, per_unit: 1, needs: [visit], sd: 5, measured_in: points}
  c: {per_unit: 2, reliability: 0.95}
  e: {per_unit: 0.1}
  z: {per_unit: 0.5}
components:
  visit: {setup: 500, per_unit: 10}
"""
"""A tiny study whose strengths are known; by each route it is sized to the same chance."""


@pytest.fixture
def told(run: Callable[..., Ran], write: Callable[..., Path]) -> Callable[..., str]:
    """The page of SIZED with some of its text replaced, as one line."""

    def page(*changes: tuple[str, str], words: Sequence[str] = ()) -> str:
        text = SIZED
        for old, new in changes:
            assert old in text
            text = text.replace(old, new)
        return " ".join(run("recommend", write(text), *words).out.split())

    return page


TARGET = "size: {detect: implied, power: 0.8}"


def test_a_target_says_how_many_records_and_why(told: Callable[..., str]) -> None:
    page = told()
    assert (
        "It takes 53 complete records to detect the effect of 0.25 that the strengths imply (outcome"
        " SDs per treatment SD) with a chance of 80 % (power). To end with so many, start 53 units:"
        " 1,353.30 EUR in all. Proved: if the diagram, its strengths and the prices are right, no study by"
        " any route within the limits does as much for less. The best other route, conditioning on"
        " covariates, takes 1,797.20 EUR on 92 records: adjust for c and e."
    ) in page


def test_an_effect_to_detect_is_the_users_own(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {detect: 0.3, power: 0.9, confidence: 0.9}"))
    assert (
        "to detect the effect of 0.3 (outcome SDs per treatment SD) with a chance of 90 %" in page
    )
    assert "90 % confidence ± 0.168" in page


def test_a_half_width_is_kept(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {half_width: 0.1}"))
    wanted = "for a 95 % confidence interval of ± 0.1 (outcome SDs per treatment SD)."
    assert f"complete records {wanted}" in page


def test_natural_units_are_named(told: Callable[..., str]) -> None:
    """0.25 SDs per SD are 0.25 · 5/2 points per hour."""
    page = told((TARGET, "size: {detect: implied, power: 0.8, in: units}"))
    assert "to detect the effect of 0.625 that the strengths imply (points per hours)" in page
    assert "Intervals are in points per hours." in page


def test_money_buys_an_interval(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {spend: 1353.30}"))
    assert (
        "1,353.30 EUR buys 53 complete records and with them a 95 % confidence interval of ± 0.175"
        " (outcome SDs per treatment SD), which detects the effect of 0.25 that the strengths imply"
        " with a chance of 80.3 % (power). To end with so many, start 53 units: 1,353.30 EUR in all."
        " Proved: if the diagram, its strengths and the prices are right, no study by any route within the"
        " limits has a narrower interval."
    ) in page
    assert "The best other route, conditioning on covariates, takes 1,346.00 EUR on 60" in page


def test_records_that_are_given_say_what_they_achieve(told: Callable[..., str]) -> None:
    """The instrument is cheapest for each record, and what it would take is worked out in money."""
    page = told((TARGET, "size: {records: 200}"))
    before, _, _ = page.partition("WHAT THE PRICE LEANS ON")
    assert "To end with 200 complete records, start 200 units: 3,000.00 EUR in all." in before
    assert "They give a 95 % confidence interval of ± 0.32" in before
    assert "Whether 200" not in before
    assert "1/ρ²" not in before
    assert "BUT MIND: this is the cheapest plan for so many records, not for the same" in before
    assert "To say as much as the plan by conditioning on covariates does for" in before


def test_records_without_strengths_say_what_is_missing(told: Callable[..., str]) -> None:
    page = told(
        (TARGET, "size: {records: 200}"), ("{x: 0.5}", "[x]"), ("tolerance: {bias: 0.2}\n", "")
    )
    before, _, _ = page.partition("WHAT THE PRICE LEANS ON")
    assert "Whether 200 are enough is not worked out: 1 strength is missing: x → m." in before
    assert "An instrument needs roughly 1/ρ² times the records of an adjusted" in before
    assert "half-width" not in page


def test_an_effect_that_cancels_is_told(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {records: 200}"), ("{m: 0.5, c", "{m: 0.5, x: -0.25, c"))
    assert (
        "Whether 200 are enough is not worked out: by the strengths the effect is zero, as the"
        " directed paths from x to y cancel."
    ) in page


def test_a_tie_shows_both(told: Callable[..., str]) -> None:
    """At 12.20 for each reading of the mediator both routes cost nearly the same."""
    page = told(("per_unit: 4, reliability", "per_unit: 12.20, reliability"))
    before, _, _ = page.partition("WHAT THE PRICE LEANS ON")
    assert "A TIE with " in before
    assert "and prices and strengths are not known to within 5 %" in before
    assert "The best other route" not in before
    assert "See it whole with --route" in before


def test_extras_say_what_they_save(told: Callable[..., str]) -> None:
    page = told()
    assert (
        "extras (any one of them could go, not all) e standard 53 0.10 – 5.30 not needed for"
        " validity; without it the same precision would cost 170.70 EUR more"
    ) in page


def test_extras_say_which_limit_they_keep(run: Callable[..., Ran]) -> None:
    page = " ".join(run("recommend", ROOT / "examples" / "tariff.yaml").out.split())
    assert (
        "three questions on windows, walls, roof: not needed for validity; without it, errors in the other readings could"
        " put the estimate off by 16.1 % of the effect, where 15 % is allowed"
    ) in page


def test_bias_beyond_the_limit_is_told(told: Callable[..., str]) -> None:
    page = told(("{bias: 0.2}", "{bias: 0.05}"), words=["--route", "mechanism"])
    assert "No plan stays within the limits." in page
    assert "It would take a bias bound of 12.91 %, where 5 % is allowed." in page
    dearer = told(("{bias: 0.2}", "{bias: 0.05}"))
    assert "Beyond the limits, the mechanism would cost less, 1,353.30 EUR. It would" in dearer


def test_a_weak_first_stage_is_told(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {records: 60}"), words=["--route", "instrument"])
    assert "a first-stage F of " in page
    assert ", where 20 is the least allowed" in page


def test_a_first_stage_that_asks_for_more_records_says_so(told: Callable[..., str]) -> None:
    page = told(("{bias: 0.2}", "{first_stage_F: 200}"), words=["--route", "instrument"])
    assert ", so many because the first-stage F is to reach 200." in page


def test_too_few_records_for_the_variables_are_told(told: Callable[..., str]) -> None:
    page = told((TARGET, "size: {records: 3}"), words=["--route", "conditioning"])
    assert "It would take 5 records, where the study has 3." in page


def test_a_frame_that_is_too_small_for_the_target_is_told(told: Callable[..., str]) -> None:
    page = told(("tolerance", "fieldwork: {frame_size: 40}\ntolerance"))
    assert "No plan stays within the limits." in page
    assert "By the mechanism: It would take a frame of 53 units, where there are 40." in page


def test_what_no_number_of_records_shows_is_told(told: Callable[..., str]) -> None:
    """Read so poorly, the covariate leaves enough of its own path to turn the sign."""
    page = told(
        ("reliability: 0.95", "reliability: 0.05"),
        ("c: 0.3", "c: -0.7"),
        ("tolerance: {bias: 0.2}\n", ""),
        words=["--route", "conditioning"],
    )
    assert "not even 1,000,000,000 records would show it" in page


def test_a_search_that_is_cut_short_claims_no_proof() -> None:
    answer = recommend(read_study(ROOT / "examples" / "permits.yaml"))
    (effect,) = answer.effects
    plan, buy = effect.routes[1].plan, answer.buy
    assert plan is not None
    assert buy is not None
    unsure = replace(buy, lower_bound=buy.bill.total - 1000)
    assert proof(answer.study, unsure, plan) == (
        "Not proved: the time ran out. No plan costs less than 16,261.18 EUR, so at most 5.8 % could"
        " still be saved."
    )
    money = replace(answer.study, size=Size(spend=buy.bill.total))
    assert proof(money, unsure, replace(plan, narrowest=0.0987654)) == (
        "Not proved: the time ran out. No study within the limits has a half-width below 0.0987."
    )

"""The report on a terminal: whole pages that a person has read, and what no name may break.

After a change that is meant, ``pytest --update-golden`` writes the pages anew; read them before
they are committed.
"""

from collections.abc import Callable
from pathlib import Path

import pytest

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
        "WHAT TO BUY",
        "DO NOT ADJUST FOR",
        "WHAT IT LEANS ON",
        "THE BILL",
        "THE ROUTES SIDE BY SIDE",
        "WHY EACH ROUTE IS OPEN OR NOT",
        "MEASURABLE, BUT NOT NEEDED",
        "ALSO GOOD TO KNOW",
    ]


def test_an_instrument_comes_with_its_price_in_records(run: Callable[..., Ran]) -> None:
    page = " ".join(run("recommend", ROOT / "examples" / "tariff.yaml").out.split())
    before, _, _ = page.partition("WHAT TO BUY")
    assert "1/ρ² times the records" in before
    assert "1,600 records (62,436.00 EUR) if ρ is 0.5" in before
    assert "40,000 records (more than the frame holds) if ρ is 0.1" in before
    assert before.endswith(
        "The best other route, the mechanism, would be to follow the effect through shift, adjusting for"
        " electric_heat: 22,725.00 EUR. "
    )

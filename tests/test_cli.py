"""The command line as its user meets it: what goes where, and the exit codes."""

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from planner import VERSION, recommend
from planner.reading import read_study
from tests.conftest import ROOT, Ran

PERMITS = ROOT / "examples" / "permits.yaml"
FIRST = ROOT / "examples" / "first_study.yaml"


def test_a_new_study_passes_the_check(
    run: Callable[..., Ran], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    ran = run("new", "mine.yaml")
    assert ran == Ran(0, "", "mine.yaml is written. Next: measurewise check mine.yaml\n")
    assert (tmp_path / "mine.yaml").read_text(encoding="utf-8") == FIRST.read_text(encoding="utf-8")
    checked = run("check", "mine.yaml")
    assert (checked.code, checked.err) == (0, "")
    assert checked.out.startswith("mine.yaml: no faults.\n")
    assert "Worth a second look" not in checked.out


def test_a_new_study_overwrites_nothing(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write("mine", "study.yaml")
    ran = run("new")
    assert (ran.code, ran.out) == (2, "")
    assert ran.err.startswith("study.yaml:1: new: is there already.")
    assert path.read_text() == "mine"


def test_check_prints_figures_or_json(run: Callable[..., Ran]) -> None:
    ran = run("check", PERMITS)
    assert ran.code == 0
    assert "  implied effect  -0.158 outcome SDs per treatment SD\n" in ran.out
    assert (
        "  size            detect the effect that the strengths imply, with power 0.8\n" in ran.out
    )
    assert "  variables       19: 17 measurable, 2 not; 0 hidden common causes\n" in ran.out
    assert "  arrows          31, 31 of them with a strength\n" in ran.out
    values = json.loads(run("check", PERMITS, "--json").out)
    assert (values["variables"], values["arrows"], values["remarks"]) == (19, 31, [])
    assert values["records"] is None
    assert values["effect"] == pytest.approx(-0.1575)
    # Without strengths no effect is implied, and the headings take less room.
    ran = run("check", FIRST)
    assert "implied" not in ran.out
    assert "  size       400 records\n" in ran.out
    assert json.loads(run("check", FIRST, "--json").out)["records"] == 400


def test_faults_go_to_stderr_and_give_exit_code_2(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write("title: [\n")
    for words in (("check", path), ("recommend", path), ("recommend", path, "--json")):
        ran = run(*words)
        assert (ran.code, ran.out) == (2, "")
        assert ran.err.startswith("study.yaml:2: file: is no YAML here")


def test_json_is_one_document_and_the_answer(run: Callable[..., Ran]) -> None:
    ran = run("recommend", PERMITS, "--json")
    assert (ran.code, ran.err) == (0, "")
    assert json.loads(ran.out) == json.loads(json.dumps(recommend(read_study(PERMITS)).as_dict()))


def test_no_plan_gives_exit_code_1_and_a_full_report(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write(
        "effect: {treatment: x, outcome: y}\nsize: {records: 10}\n"
        "variables: {x: {per_unit: 1}, y: {caused_by: [x], per_unit: 1}}\n"
        "hidden_common_causes: [[x, y]]\n"
    )
    ran = run("recommend", path)
    assert ran.code == 1
    assert "No route leads to this effect with what can be measured." in ran.out
    assert "x ← (hidden common cause) → y" in ran.out
    assert json.loads(run("recommend", path, "--json").out)["status"] == "impossible"


def test_options_change_the_study(run: Callable[..., Ran]) -> None:
    def answer(*words: str) -> dict:  # type: ignore[type-arg]
        ran = run("recommend", PERMITS, "--json", *words)
        assert ran.err == ""
        return json.loads(ran.out)

    plain = answer()
    assert plain["size"] == {"detect": "implied", "power": 0.8}
    hundred = answer("--records", "100")
    assert (hundred["size"], hundred["buy"]["records"]) == ({"records": 100}, 100)
    routes = answer("--route", "conditioning")["effects"][0]["routes"]
    assert [each["route"] for each in routes] == ["conditioning"]
    held = answer("--held", "file_quality.audit")
    assert plain["buy"]["measure"]["file_quality"] == "audit"
    assert held["buy"]["cost"]["total"] < plain["buy"]["cost"]["total"]
    assert held["inputs"]["changes"] == ["--held file_quality.audit"]
    without = answer("--without", "file_quality", "--without", "quarter")
    assert without["effects"][0]["recommended"] == "conditioning"


def test_json_says_what_a_plan_achieves(run: Callable[..., Ran]) -> None:
    routes = json.loads(run("recommend", PERMITS, "--json").out)["effects"][0]["routes"]
    plan = {each["route"]: each["plan"] for each in routes}["mechanism"]
    precision = plan["precision"]
    assert precision["effect"] == pytest.approx(-0.1575)
    assert abs(precision["limit"]) < abs(precision["effect"])
    assert 0.8 <= precision["power"] < 0.81
    assert max(precision["bias_sources"].values()) < precision["bias_bound"] <= 0.15
    assert precision["first_stage_F"] is None
    (extra,) = plan["extras"]
    assert extra == {"variable": "project_size", "saves": 206.04}
    reasons = {each["variable"]: each["text"] for each in plan["needed"]}
    assert reasons["project_size"] == (
        "not needed for validity, but it steadies the estimate by more than it costs"
    )


def test_prices_can_be_replaced(run: Callable[..., Ran], write: Callable[..., Path]) -> None:
    text = (ROOT / "costs" / "lists" / "permit_office.csv").read_text(encoding="utf-8")
    old, new = "score the lodged file,1500,34.00", "score the lodged file,1500,0.00"
    assert old in text
    path = write(text.replace(old, new), "cheap.csv")
    ran = run("recommend", PERMITS, "--json", "--prices", path)
    bill = json.loads(ran.out)["buy"]["bill"]
    assert {line["name"]: line["amount"] for line in bill}["file_quality.audit"] == 1500


def test_options_that_make_no_sense_are_refused(run: Callable[..., Ran]) -> None:
    for words, message in (
        (("--without", "premeet"), "--without: without 'premeet' the treatment 'premeet' cannot"),
        (
            ("--without", "gus"),
            "--without: 'gus' is nothing that can be bought.\n    Did you mean 'gis'?",
        ),
        (("--held", "gis"), "--held: 'gis' is nothing that can be bought."),
        (("--route", "instrument"), "--route: 'instrument' is no route that the study allows."),
        (("--records", "0"), "--records: is 0."),
    ):
        ran = run("recommend", PERMITS, *words)
        assert (ran.code, ran.out) == (2, "")
        assert ran.err.startswith(f"command line:1: {message}")


def test_what_cannot_be_applied_is_told(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write(FIRST.read_text(encoding="utf-8") + "tolerance: {bias: 0.1}\n")
    ran = run("recommend", path)
    assert ran.err == (
        "note: tolerance.bias cannot be applied: 10 strengths are missing: drawn → visit, income → visit,"
        " dwelling → visit and 7 more.\n"
    )


def test_the_version_is_told(run: Callable[..., Ran]) -> None:
    assert run("--version") == Ran(0, f"measurewise {VERSION}\n", "")


def test_help_lists_every_command(run: Callable[..., Ran]) -> None:
    ran = run("--help")
    assert ran.code == 0
    for word in ("new", "check", "recommend", "--version", "--install-completion"):
        assert word in ran.out


def test_words_that_are_no_command_are_refused(run: Callable[..., Ran]) -> None:
    ran = run("recomend", PERMITS)
    assert (ran.code, ran.out) == (2, "")
    assert "recommend" in ran.err


def test_help_names_what_to_write_and_cuts_no_sentence_short(run: Callable[..., Ran]) -> None:
    # It once ended in "never over another...", and asked for <list[str]>.
    for words in ((), ("new",), ("check",), ("recommend",)):
        shown = run(*words, "--help").out
        assert "Usage:" in shown
        assert "..." not in shown.replace("[ARGS]...", "")
        assert "list[" not in shown

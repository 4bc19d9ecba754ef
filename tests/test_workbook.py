"""The hand-over workbook: text stays text, and its live total is the plan's."""

import csv
import re
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import load_workbook

from planner import read_study, recommend
from tests.conftest import EXAMPLES, ROOT, Ran

OUR_FORMULA = re.compile(
    r"=(bill!|B4\*PRODUCT\(|PRODUCT\(J|ROUNDUP\(ROUND\(|E\d+\+|SUM\(K|K\d+\*B7|\(K\d+\+K).*"
)
PERMITS = ROOT / "examples" / "permits.yaml"
LOSSY = """\
title: "=1+1 is a title"
effect: {treatment: "=x", outcome: "+y"}
size: {records: 360}
variables:
  "=x": {caused_by: ["-c"], per_unit: 1, label: "=HYPERLINK(1)", needs: [call]}
  "+y": {caused_by: ["=x", "-c"], per_unit: 0.5, takes: {minutes: 2}, yields: 0.9}
  "-c": {per_unit: 2, batch: {holds: 7, price: 3.25}, needs: [call]}
components:
  call: {always: yes, per_unit: 0.30, setup: 100, yields: 0.8}
burdens: {minutes: {price: 0.75}}
fieldwork: {usable: 0.7}
overhead: 0.25
contingency: 0.05
"""


def written(run: Callable[..., Ran], study: Path, tmp_path: Path) -> Path:
    """The workbook of a study's plan."""
    path = tmp_path / "plan.xlsx"
    ran = run("recommend", study, "--workbook", path)
    assert (ran.code, ran.err) == (0, f"{path} is written.\n")
    return path


def test_the_measurement_list_is_that_of_the_plan(run: Callable[..., Ran], tmp_path: Path) -> None:
    book = load_workbook(written(run, PERMITS, tmp_path))
    assert book.sheetnames == ["measure", "bill", "precision"]
    rows = list(book["measure"].iter_rows(min_row=12, max_row=18, values_only=True))
    plan = recommend(read_study(PERMITS)).effects[0].routes[1].plan
    assert plan is not None
    assert [row[0] for row in rows] == [*plan.buy.measure, *plan.buy.bill.components]
    how = "past applications in the agents' registry"
    assert rows[2][:4] == ("agent", "covariate", "registry", how)
    assert rows[2][10] == (
        "left out, premeet ← agent → file_quality would pass for part of the mechanism"
    )
    assert rows[4][10] == (
        "not needed for validity; without it the same precision would cost 206.04 EUR more"
    )


def test_what_the_plan_achieves_has_a_sheet(run: Callable[..., Ran], tmp_path: Path) -> None:
    sheet = load_workbook(written(run, PERMITS, tmp_path))["precision"]
    rows = {row[0]: row[1] for row in sheet.iter_rows(min_row=5, max_col=2, values_only=True)}
    assert rows["complete records"] == "121"
    assert rows["units started"] == "127"
    assert rows["effects are in"] == "outcome SDs per treatment SD"
    assert rows["effect that is taken to be true"] == "-0.158"
    assert rows["95 % confidence interval (half-width)"] == "± 0.111"
    assert rows["chance to detect the effect (power)"] == "80 %"
    assert rows["chance that the interval holds the effect (coverage)"] == "92.8 %"
    assert rows["bias by errors of readings, up to about"] == "14.2 %"
    assert rows["  alone by file_quality.audit"] == "10.4 %"
    assert "  alone by project_size.system" not in rows
    leaning = "the whole effect of premeet on days runs through file_quality"
    assert any(str(name).startswith(leaning) for name in rows)


def test_without_strengths_the_sheet_says_so(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    sheet = load_workbook(written(run, write(LOSSY), tmp_path))["precision"]
    assert sheet["B5"].value == "360"
    assert sheet["B7"].value == "not worked out: 3 strengths are missing: -c → =x, =x → +y, -c → +y"


def test_text_that_begins_like_a_formula_stays_text(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    book = load_workbook(written(run, write(LOSSY), tmp_path))
    for sheet in book:
        cells = [cell for row in sheet.iter_rows() for cell in row if cell.data_type == "f"]
        assert {cell.value for cell in cells if not OUR_FORMULA.fullmatch(cell.value)} == set()
    assert book["bill"]["A1"].value == "=1+1 is a title"
    assert book["bill"]["A1"].data_type == "s"


def test_no_file_is_replaced_unasked(run: Callable[..., Ran], tmp_path: Path) -> None:
    path = written(run, PERMITS, tmp_path)
    before = path.read_bytes()
    ran = run("recommend", PERMITS, "--workbook", path)
    assert (ran.code, ran.out) == (2, "")
    assert "--workbook: is there already." in ran.err
    assert path.read_bytes() == before
    assert run("recommend", PERMITS, "--workbook", path, "--force").code == 0
    gone = run("recommend", PERMITS, "--workbook", tmp_path / "no" / "plan.xlsx")
    assert "lies in a folder that is not there." in gone.err
    assert sorted(tmp_path.iterdir()) == [path]


def test_without_a_plan_there_is_no_workbook(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    path = write(
        "effect: {treatment: x, outcome: y}\nsize: {records: 1}\n"
        "variables: {x: {per_unit: 1}, y: {per_unit: 1}}\n"
    )
    ran = run("recommend", path, "--workbook", "plan.xlsx")
    assert ran.code == 1
    assert ran.err == "There is no plan, so plan.xlsx is not written.\n"
    assert not (tmp_path / "plan.xlsx").exists()


@pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed")
@pytest.mark.parametrize(
    "study", [*EXAMPLES, None], ids=lambda each: each.stem if each else "lossy"
)
def test_the_live_total_is_the_plans(
    study: Path | None, run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    """Recomputed by a spreadsheet program: total, and the units of every line."""
    path = study or write(LOSSY)
    buy = recommend(read_study(path)).buy
    assert buy is not None
    lines = recomputed(written(run, path, tmp_path), tmp_path)
    assert float(lines["total"][10]) == pytest.approx(float(buy.bill.total), abs=0.005)
    for line in buy.bill.lines:
        if line.units:
            assert int(lines[line.name][3]) == line.units
            assert float(lines[line.name][10]) == pytest.approx(float(line.amount), abs=0.005)


@pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed")
def test_what_is_changed_in_the_workbook_is_what_the_tool_would_say(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    """A yield, a price and the number of records are changed by hand; the study likewise."""
    workbook = written(run, write(LOSSY), tmp_path)
    book = load_workbook(workbook)
    bill = book["bill"]
    rows = {bill.cell(row, 1).value: row for row in range(12, 18)}
    bill["B3"] = 500
    bill.cell(rows["call"], 10).value = 0.5
    bill.cell(rows["-c.standard"], 6).value = 7.25
    book.save(workbook)
    changed = LOSSY.replace("yields: 0.8", "yields: 0.5").replace("records: 360", "records: 500")
    changed = changed.replace('"-c": {per_unit: 2,', '"-c": {per_unit: 7.25,')
    buy = recommend(read_study(write(changed, "changed.yaml"))).buy
    assert buy is not None
    lines = recomputed(workbook, tmp_path)
    assert float(lines["total"][10]) == pytest.approx(float(buy.bill.total), abs=0.005)
    measured = recomputed(workbook, tmp_path, "measure")
    assert float(measured["total, surcharges included"][9]) == float(lines["total"][10])
    assert measured["-c"][4] == lines["-c.standard"][3]


def recomputed(workbook: Path, tmp_path: Path, sheet: str = "bill") -> dict[str, list[str]]:
    """The rows of a sheet by their first cell, formulas worked out by LibreOffice."""
    form = "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,-1"
    home = f"-env:UserInstallation={(tmp_path / 'office').as_uri()}"
    command = ["soffice", home, "--headless", "--convert-to", form, "--outdir", tmp_path, workbook]
    subprocess.run(command, check=True, capture_output=True, timeout=120)
    with (tmp_path / f"plan-{sheet}.csv").open(encoding="utf-8", newline="") as file:
        return {row[0]: row for row in csv.reader(file)}

"""The hand-over workbook: text stays text, and its live total is the plan's."""

import csv
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import load_workbook

from planner import read_study, recommend
from tests.conftest import EXAMPLES, ROOT, Ran

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
    assert book.sheetnames == ["measure", "bill"]
    rows = list(book["measure"].iter_rows(min_row=5, values_only=True))
    plan = recommend(read_study(PERMITS)).effects[0].routes[0].plan
    assert plan is not None
    assert [row[0] for row in rows] == [*plan.buy.measure, *plan.buy.bill.components]
    assert rows[2][:4] == ("agent", "covariate", "form", "ticked on the form")
    assert rows[2][8] == (
        "left out, premeet ← agent → file_quality → days would pass for an effect of premeet"
    )


def test_text_that_begins_like_a_formula_stays_text(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    book = load_workbook(written(run, write(LOSSY), tmp_path))
    for sheet in book:
        cells = [cell for row in sheet.iter_rows() for cell in row if cell.data_type == "f"]
        assert {cell.column_letter for cell in cells} <= {"B", "D", "K"}
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


def recomputed(workbook: Path, tmp_path: Path) -> dict[str, list[str]]:
    """The rows of the bill by their name, formulas worked out by LibreOffice."""
    form = "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,2"
    home = f"-env:UserInstallation={(tmp_path / 'office').as_uri()}"
    command = ["soffice", home, "--headless", "--convert-to", form, "--outdir", tmp_path, workbook]
    subprocess.run(command, check=True, capture_output=True, timeout=120)
    with (tmp_path / "plan-bill.csv").open(encoding="utf-8", newline="") as file:
        return {row[0]: row for row in csv.reader(file)}

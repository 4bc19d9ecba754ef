"""The hand-over workbook: the measurement list, and the bill with live formulas.

Changing a price, a yield, a share or the number of records in the bill updates units, batches and
totals there and in the measurement list; as it is written, its total is the plan's. What the plan
achieves stands on a sheet of its own, as text: it does not follow such changes.
"""

import io
import re
from collections.abc import Sequence
from fractions import Fraction
from typing import TYPE_CHECKING

from costs.bill import Bill, needed_by, running_price
from costs.prices import Name, Purchase, shown_name
from planner.plan import Buy
from planner.report.view import View
from planner.study import Study

if TYPE_CHECKING:
    from openpyxl.cell import Cell, MergedCell
    from openpyxl.worksheet.worksheet import Worksheet

__all__ = ["workbook_bytes"]

MONEY = "#,##0.00##"
FIRST_LINE = 12
"""The row of the first line of the bill, below the terms and the heading."""
BILL_COLUMNS = (
    ("line", 24),
    ("kind", 12),
    ("reaches (share of units started)", 12),
    ("units", 10),
    ("set-up", 12),
    ("per unit", 12),
    ("burdens per unit", 12),
    ("batch price", 12),
    ("batch holds", 10),
    ("yields (share that comes through)", 12),
    ("amount", 14),
)
MEASURE_COLUMNS = (
    ("what", 20),
    ("part", 12),
    ("way", 14),
    ("how", 44),
    ("units", 10),
    ("set-up", 12),
    ("per unit", 12),
    ("burdens per unit", 12),
    ("batch price", 12),
    ("in all", 14),
    ("why", 70),
)
PRECISION_COLUMNS = (("what", 56), ("as planned, on the records of the plan", 44))
TOTAL = 5
"""Rows from the last purchase to the total of the bill."""
FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
"""Characters that XML forbids."""


def workbook_bytes(view: View, study: Study, buy: Buy) -> bytes:
    """Return the workbook as the content of an XLSX file."""
    # Imported here: it takes a quarter of a second, and most reports are no workbook.
    from openpyxl import Workbook  # noqa: PLC0415

    book = Workbook()
    sheet = book.active
    assert sheet is not None, "a new workbook has a sheet"
    write_measurements(sheet, view)
    write_bill(book.create_sheet("bill"), view, study, buy)
    write_precision(book.create_sheet("precision"), view)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def write_measurements(sheet: "Worksheet", view: View) -> None:
    """Write the measurement list: what is bought, in which part, and why; figures from the bill."""
    sheet.title = "measure"
    write_text(sheet["A1"], view.title, bold=True)
    write_text(sheet["A2"], view.subject)
    write_heading(sheet, FIRST_LINE - 1, MEASURE_COLUMNS)
    for row, item in enumerate(view.bought, FIRST_LINE):
        texts = (item.name, item.part, item.way, item.how)
        for column, text in enumerate(texts, 1):
            write_text(sheet.cell(row, column), text)
        for column, source in enumerate(("D", "E", "F", "G", "H", "K"), 5):
            money = MONEY if source != "D" else ""
            write_value(sheet.cell(row, column), f"=bill!{source}{row}", money)
        write_text(sheet.cell(row, 11), item.why)
    last = FIRST_LINE + len(view.bought) - 1
    write_text(sheet.cell(last + 2, 1), "total, surcharges included", bold=True)
    write_value(sheet.cell(last + 2, 10), f"=bill!K{last + TOTAL}", MONEY)
    sheet.freeze_panes = f"B{FIRST_LINE}"


def write_precision(sheet: "Worksheet", view: View) -> None:
    """Write what the plan achieves on its records, and what that leans on."""
    write_text(sheet["A1"], view.title, bold=True)
    write_text(sheet["A2"], view.subject)
    write_heading(sheet, 4, PRECISION_COLUMNS)
    for row, note in enumerate(view.precision, 5):
        write_text(sheet.cell(row, 1), note.name)
        write_text(sheet.cell(row, 2), note.text)
    first = 5 + len(view.precision) + 1
    write_text(sheet.cell(first, 1), "the price leans on", bold=True)
    for row, clause in enumerate(view.leans_on, first + 1):
        write_text(sheet.cell(row, 1), clause)


def write_bill(sheet: "Worksheet", view: View, study: Study, buy: Buy) -> None:
    """Write the bill: terms on top, a row for each purchase, surcharges and the total below."""
    names: list[Name] = [*buy.measure.items(), *buy.bill.components]
    rows = {name: row for row, name in enumerate(names, FIRST_LINE)}
    last = FIRST_LINE + len(names) - 1
    write_text(sheet["A1"], view.title, bold=True)
    write_terms(sheet, study, buy.bill, last)
    write_heading(sheet, FIRST_LINE - 1, BILL_COLUMNS)
    for name, row in rows.items():
        purchase = study.prices.purchase(name)
        write_text(sheet.cell(row, 1), shown_name(name))
        write_text(sheet.cell(row, 2), "component" if isinstance(name, str) else "way")
        write_line(sheet, row, study, buy, purchase)
        needs = sorted(rows[need] for need in needed_by(purchase.needs, study.prices))
        yields = ",".join(f"J{need}" for need in needs)
        write_value(sheet.cell(row, 3), f"=PRODUCT({yields})" if needs else 1)
    write_totals(sheet, last)
    sheet.freeze_panes = f"B{FIRST_LINE}"


def write_terms(sheet: "Worksheet", study: Study, bill: Bill, last: int) -> None:
    """Write what the counts and surcharges follow from."""
    places = rounding_places(bill.started)
    rows: Sequence[tuple[str, Fraction | int | str]] = (
        ("complete records", bill.records),
        ("usable share of them", study.terms.usable),
        ("share of started units kept", f"=B4*PRODUCT(J{FIRST_LINE}:J{last})"),
        ("units started", f"=ROUNDUP(ROUND(B3/B5,{places}),0)"),
        ("overhead (share of direct costs)", study.terms.overhead),
        ("contingency (share of both)", study.terms.contingency),
    )
    for row, (label, value) in enumerate(rows, 3):
        write_text(sheet.cell(row, 1), label)
        write_value(sheet.cell(row, 2), value)
    write_text(sheet.cell(9, 1), "currency")
    write_text(sheet.cell(9, 2), study.currency)


def write_line(sheet: "Worksheet", row: int, study: Study, buy: Buy, purchase: Purchase) -> None:
    """Write the numbers of one purchase, its units and its amount as formulas."""
    places = rounding_places(buy.bill.started)
    batch = purchase.batch
    cells: dict[int, Fraction | int | str] = {
        4: f"=ROUNDUP(ROUND($B$6*C{row},{places}),0)",
        5: purchase.setup,
        6: purchase.per_unit,
        7: running_price(purchase, study.terms) - purchase.per_unit,
        8: batch.price if batch else 0,
        9: batch.holds if batch else 1,
        10: purchase.yields,
        11: f"=E{row}+(F{row}+G{row})*D{row}+H{row}*ROUNDUP(D{row}/I{row},0)",
    }
    for column, value in cells.items():
        write_value(sheet.cell(row, column), value, MONEY if column in {5, 6, 7, 8, 11} else "")


def write_totals(sheet: "Worksheet", last: int) -> None:
    """Write direct costs, surcharges and the total, as formulas."""
    direct = last + 2
    for row, label, formula in (
        (direct, "direct costs", f"=SUM(K{FIRST_LINE}:K{last})"),
        (direct + 1, "overhead", f"=K{direct}*B7"),
        (direct + 2, "contingency", f"=(K{direct}+K{direct + 1})*B8"),
        (last + TOTAL, "total", f"=SUM(K{direct}:K{direct + 2})"),
    ):
        write_text(sheet.cell(row, 1), label, bold=label == "total")
        write_value(sheet.cell(row, 11), formula, MONEY)


def rounding_places(count: int) -> int:
    """Return to how many places a count is rounded before it is rounded up.

    A spreadsheet counts in 15 digits; without this, 500 units could come out as 501.
    """
    return max(0, 13 - len(str(count)))


def write_heading(sheet: "Worksheet", row: int, columns: Sequence[tuple[str, int]]) -> None:
    """Write the names of the columns, and set their widths."""
    from openpyxl.styles import Alignment  # noqa: PLC0415
    from openpyxl.utils import get_column_letter  # noqa: PLC0415

    for column, (name, width) in enumerate(columns, 1):
        cell = sheet.cell(row, column)
        write_text(cell, name, bold=True)
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        sheet.column_dimensions[get_column_letter(column)].width = width


def write_value(
    cell: "Cell | MergedCell", value: Fraction | int | str, number_format: str = ""
) -> None:
    """Write a number, or a formula of our own."""
    cell.value = float(value) if isinstance(value, Fraction) else value
    if number_format:
        cell.number_format = number_format


def write_text(cell: "Cell | MergedCell", text: str, *, bold: bool = False) -> None:
    """Write text that stays text, whatever it begins with, without characters that XML forbids."""
    from openpyxl.styles import Font  # noqa: PLC0415

    cell.value = FORBIDDEN.sub(" ", text)
    cell.data_type = "s"
    cell.font = Font(bold=bold)

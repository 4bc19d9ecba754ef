"""Price lists as tables: both separators, workbooks, and where exactly each fault is."""

import io
import zipfile
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import pytest
from openpyxl import Workbook

from costs.faults import Faults, FaultyInput
from costs.prices import Batch, Component, Way
from costs.reading import PriceFile, read_price_file

COMMAS = """\
variable,way,component,label,setup,per_unit,batch_holds,batch_price,needs,takes,reliability,yields,always,source,note
c,file,,"a file, yes",2,0.50,38,760,base kit,minutes:2 blood_ml:5,0.9,0.8,,office,
x,,,,,1,,,,,,,,,
,,base,,6000,,,,,,,0.35,yes,,
"""
SEMICOLONS = """\
variable;way;component;setup;per_unit;takes;yields
c;file;;2;0,50;minutes:2,5;0,8
;;base;6000;;;
"""


def read(path: Path) -> tuple[PriceFile, str]:
    """What a price list says, and its faults."""
    faults = Faults()
    found = read_price_file(path, faults)
    assert found is not None
    try:
        faults.raise_any()
    except FaultyInput as faulty:
        return found, str(faulty)
    return found, ""


def workbook(*sheets: tuple[str, list[list[object]]]) -> bytes:
    """A workbook with these sheets."""
    book = Workbook()
    book.remove(book.worksheets[0])
    for title, rows in sheets:
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(row)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def test_a_row_is_a_way_or_a_component(write: Callable[..., Path]) -> None:
    found, faults = read(write(COMMAS, "p.csv"))
    assert faults == ""
    assert [(each.variable, each.name) for each in found.listed] == [
        ("c", "file"),
        ("x", "standard"),
        ("", "base"),
    ]
    assert found.listed[0].purchase == Way(
        label="a file, yes",
        setup=Fraction(2),
        per_unit=Fraction("0.5"),
        batch=Batch(holds=38, price=Fraction(760)),
        needs=("base", "kit"),
        takes={"minutes": Fraction(2), "blood_ml": Fraction(5)},
        reliability=Fraction("0.9"),
        yields=Fraction("0.8"),
        texts={"source": "office"},
    )
    assert found.listed[2].purchase == Component(
        setup=Fraction(6000), yields=Fraction("0.35"), always=True
    )


def test_semicolons_bring_decimal_commas(write: Callable[..., Path]) -> None:
    found, faults = read(write(SEMICOLONS, "p.csv"))
    assert faults == ""
    way = found.listed[0].purchase
    assert (way.per_unit, way.yields) == (Fraction("0.5"), Fraction("0.8"))
    assert way.takes == {"minutes": Fraction("2.5")}


def test_a_workbook_says_the_same_as_the_table(write: Callable[..., Path]) -> None:
    rows: list[list[object]] = [
        ["Variable", "way", "component", "setup", "per_unit", "needs", "takes", "always"],
        ["c", "file", None, 2, 0.5, "base", "minutes:2", None],
        [None, None, "base", 6000, None, None, None, True],
    ]
    found, faults = read(write(workbook(("prices", rows)), "p.xlsx"))
    assert faults == ""
    assert found.listed[0].purchase == Way(
        setup=Fraction(2), per_unit=Fraction("0.5"), needs=("base",), takes={"minutes": Fraction(2)}
    )
    assert found.listed[1].purchase == Component(setup=Fraction(6000), always=True)


def test_sheets_without_a_header_are_no_price_lists(write: Callable[..., Path]) -> None:
    prices: list[list[object]] = [["variable", "per_unit"], ["x", "free"]]
    content = workbook(("about", [["Prices of the clinic"]]), ("list", prices))
    _, faults = read(write(content, "p.xlsx"))
    assert faults == (
        "p.xlsx:list!B2: x.standard.per_unit: is 'free', which is no number.\n    Write it like 12.50."
    )
    _, faults = read(write(workbook(("about", [["Prices"]])), "q.xlsx"))
    assert faults.startswith("q.xlsx:A1: header: no sheet begins with a row of column names.")


def test_formulas_are_never_evaluated(write: Callable[..., Path]) -> None:
    rows: list[list[object]] = [["variable", "label", "per_unit"], ["x", "=1+1", "=2+3"]]
    found, faults = read(write(workbook(("prices", rows)), "p.xlsx"))
    assert faults == (
        "p.xlsx:C2: x.standard.per_unit: is the formula '=2+3', and none is computed.\n"
        "    Write the number itself."
    )
    assert found.listed[0].purchase.label == "=1+1"
    _, faults = read(write("variable,per_unit\nx,=2+3\n", "p.csv"))
    assert faults.startswith("p.csv:2: x.standard.per_unit: is the formula '=2+3', and none")


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "p.csv:1: file: is empty."),
        ("variable,prize\nx,1\n", "p.csv:1: prize: is not a known column."),
        (
            "variable,per_unit,cost\nx,1,2\n",
            "p.csv:1: cost: is not a known column.\n    Write 'per_unit' for a price per unit",
        ),
        ("variable,way,way,per_unit\nx,a,b,1\n", "p.csv:1: way: names two columns."),
        ("variable,per_unit\nx,1,2\n", "p.csv:2: row: holds '2' to the right of the last column."),
        ("variable,per_unit\n,1\n", "p.csv:2: row: names neither a variable nor a component."),
        (
            "variable,component,per_unit\nx,b,1\n",
            "p.csv:2: row: names both a variable and a component.",
        ),
        ("component,way,setup\nb,w,1\n", "p.csv:2: way: names a way of a component."),
        ("variable,per_unit\nx,\n", "p.csv:2: x.standard: has no price."),
        ('variable,label,per_unit\nx,"a\nb",1\nc,,z\n', "p.csv:4: c.standard.per_unit: is 'z'"),
        (
            'variable,label\nx,"a\n',
            "p.csv:2: file: is no price list in CSV here: unexpected end of data.",
        ),
        (
            "variable;per_unit\nx;1.250\n",
            "p.csv:2: x.standard.per_unit: is '1.250': in a file separated by semicolons decimals take"
            " a comma.\n    Write it like 1,250, without marks between thousands.",
        ),
        (
            "variable,per_unit\nx,6,000\n",
            "p.csv:2: row: holds '000' to the right of the last column.",
        ),
        ("variable,takes,per_unit\nx,minutes,1\n", "p.csv:2: x.standard.takes.minutes: is empty"),
        ("component,setup,reliability\nb,1,0.5\n", "p.csv:2: b.reliability: is not a known key."),
    ],
)
def test_faults_name_the_line(text: str, message: str, write: Callable[..., Path]) -> None:
    _, faults = read(write(text, "p.csv"))
    assert faults.startswith(message)


@pytest.mark.parametrize(
    "content",
    [b"", b"PK\x03\x04 nothing", b"variable,per_unit\nx,1\n"],
    ids=["empty", "cut", "csv"],
)
def test_what_is_no_workbook_is_refused(content: bytes, write: Callable[..., Path]) -> None:
    _, faults = read(write(content, "p.xlsx"))
    assert faults.startswith("p.xlsx:A1: file: is no workbook that can be read: ")


def test_a_workbook_that_unpacks_without_end_is_refused(write: Callable[..., Path]) -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/worksheets/sheet1.xml", b"0" * 25_000_000)
    _, faults = read(write(stream.getvalue(), "p.xlsx"))
    assert "it unpacks to more than 20 MB" in faults

"""Price lists as tables: CSV with either separator, and XLSX.

A row becomes the tree that YAML gives.

A formula is read as the text it is and never computed; a workbook is read as a stream, and one that
would unpack to far more than a price list holds is refused.
"""

import csv
import io
import zipfile
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from costs.faults import Fault, Faults, Spot
from costs.files import NamedFile, text_of
from costs.located import Entries, Items, Located, Node, Scalar, Source

__all__ = ["COLUMNS", "Row", "csv_rows", "xlsx_rows"]

COLUMNS = (
    "variable",
    "way",
    "component",
    "label",
    "setup",
    "per_unit",
    "batch_holds",
    "batch_price",
    "needs",
    "takes",
    "reliability",
    "yields",
    "always",
    "source",
    "note",
)
PARTS = {"batch_holds": "holds", "batch_price": "price"}
"""Columns that together make the entry ``batch``."""
KEPT = frozenset(COLUMNS) - frozenset(PARTS) - {"variable", "way", "component", "needs", "takes"}
"""Columns that are an entry of the same name."""
LARGEST_UNPACKED = 200_000_000
"""Bytes that a workbook may unpack to."""
MOST_COLUMNS = 100
"""Columns read of a workbook; a price list has fifteen."""


@dataclass(frozen=True, slots=True)
class Row:
    """One row of a price table: its cells by column, empty ones left out."""

    spot: Spot
    cells: dict[str, Scalar]
    source: Source

    def cell(self, column: str) -> Located | None:
        """Return one cell, or None where it is empty."""
        found = self.cells.get(column)
        return None if found is None else Located(found, column, self.source)

    def entry(self, key: str) -> Located:
        """Return what the row says of a way or a component, as the entry that YAML would give."""
        pairs: list[tuple[Node, Node]] = [
            (Scalar(self.spot, column), cell)
            for column, cell in self.cells.items()
            if column in KEPT
        ]
        batch = tuple(
            (Scalar(self.spot, part), self.cells[name])
            for name, part in PARTS.items()
            if name in self.cells
        )
        if batch:
            pairs.append((Scalar(self.spot, "batch"), Entries(batch[0][1].spot, batch)))
        if "needs" in self.cells:
            cell = self.cells["needs"]
            words = tuple(Scalar(cell.spot, word) for word in cell.text.split())
            pairs.append((Scalar(self.spot, "needs"), Items(cell.spot, words)))
        if "takes" in self.cells:
            pairs.append((Scalar(self.spot, "takes"), taken(self.cells["takes"])))
        return Located(Entries(self.spot, tuple(pairs)), key, self.source)


def taken(cell: Scalar) -> Entries:
    """Return ``minutes:2 blood_ml:5`` as entries; a word without a colon has an empty amount."""
    words = [word.rpartition(":") if ":" in word else (word, ":", "") for word in cell.text.split()]
    return Entries(
        cell.spot,
        tuple((Scalar(cell.spot, name), Scalar(cell.spot, amount)) for name, _, amount in words),
    )


def csv_rows(file: NamedFile, faults: Faults) -> Iterator[Row]:
    """Return the rows of a CSV file; separated by semicolons it has decimal commas."""
    text = text_of(file, faults)
    if text is None:
        return
    semicolons = ";" in text.partition("\n")[0]
    source = Source(str(file.path), faults, decimal_comma=semicolons)
    yield from rows_below_header(csv_cells(text, ";" if semicolons else ",", source), source)


def csv_cells(text: str, delimiter: str, source: Source) -> Iterator[list[Scalar]]:
    """Return the cells of each line; the row number is the line on which the row begins."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    begins = 1
    try:
        for cells in reader:
            yield [
                Scalar(Spot(begins, column), cell.strip()) for column, cell in enumerate(cells, 1)
            ]
            begins = reader.line_num + 1
    except csv.Error as error:
        spot = Spot(begins)
        wrong = f"is no CSV here: {error}."
        source.faults.add(
            Fault(
                file=source.file,
                spot=spot,
                key="file",
                wrong=wrong,
                mend="Look for a quote that is not closed.",
            )
        )


def xlsx_rows(file: NamedFile, faults: Faults) -> Iterator[Row]:
    """Return the rows of every sheet whose first row is a header of a price table."""
    source = Source(str(file.path), faults)
    sheets = workbook_cells(file.path, file.content, faults)
    tables = [
        cells
        for cells in sheets
        if cells and {"variable", "component"} & {cell.text.casefold() for cell in cells[0]}
    ]
    if sheets and not tables:
        first = Located(Scalar(Spot(1, 1, "A1"), ""), "header", source)
        first.fault(
            "no sheet begins with a row of column names.", f"Columns: {', '.join(COLUMNS)}."
        )
    for cells in tables:
        yield from rows_below_header(iter(cells), source)


def workbook_cells(path: Path, content: bytes, faults: Faults) -> list[list[list[Scalar]]]:
    """Return the cells of each sheet, row by row; nothing, with a fault, if it is no workbook."""
    # Imported here: it takes a quarter of a second, and most studies have no workbook.
    from openpyxl import load_workbook  # noqa: PLC0415
    from openpyxl.utils import get_column_letter  # noqa: PLC0415

    def scalars(sheet: object, prefix: str) -> Iterator[list[Scalar]]:
        sheet.reset_dimensions()  # type: ignore[attr-defined]  # what a workbook says of its own size may be wrong
        for row, values in enumerate(sheet.iter_rows(values_only=True, max_col=MOST_COLUMNS), 1):  # type: ignore[attr-defined]
            yield [
                Scalar(
                    Spot(row, column, f"{prefix}{get_column_letter(column)}{row}"), cell_text(value)
                )
                for column, value in enumerate(values, 1)
            ]

    try:
        refuse_endless(content)
        book = load_workbook(io.BytesIO(content), read_only=True, data_only=False)
        many = len(book.worksheets) > 1
        return [
            list(scalars(sheet, f"{sheet.title}!" if many else "")) for sheet in book.worksheets
        ]
    except Exception as error:  # noqa: BLE001 - a damaged workbook can fail anywhere inside the library
        wrong = f"is no workbook that can be read: {error or type(error).__name__}."
        faults.add(
            Fault(
                file=str(path),
                spot=Spot(1, 1, "A1"),
                key="file",
                wrong=wrong,
                mend="Save it as XLSX again.",
            )
        )
        return []


def refuse_endless(content: bytes) -> None:
    """Refuse an archive that would unpack to far more than a price list holds."""
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        if sum(part.file_size for part in archive.infolist()) > LARGEST_UNPACKED:
            raise ValueError(f"it unpacks to more than {LARGEST_UNPACKED // 10**6} MB")


def cell_text(value: object) -> str:
    """Return what a cell holds as the text that a person would have written."""
    match value:
        case None:
            return ""
        case bool():
            return "yes" if value else "no"
        case float() if value.is_integer():
            return str(int(value))
        case _:
            return str(value).strip()


def rows_below_header(lines: Iterator[list[Scalar]], source: Source) -> Iterator[Row]:
    """Return the rows below the first, which names the columns."""
    header = next(lines, None)
    if header is None or not any(cell.text for cell in header):
        spot = Located(Scalar(Spot(1, 1), ""), "file", source)
        spot.fault("is empty.", f"Begin with a row of column names: {', '.join(COLUMNS)}.")
        return
    columns = columns_of(header, source)
    for cells in lines:
        if not any(cell.text for cell in cells):
            continue
        outside(cells, columns, source)
        named = {
            name: cell for name, cell in zip(columns, cells, strict=False) if name and cell.text
        }
        yield Row(cells[0].spot, named, source)


def columns_of(header: Iterable[Scalar], source: Source) -> list[str]:
    """Return the name of each column, empty where it has none that is known."""
    names: list[str] = []
    for cell in header:
        name = cell.text.strip().casefold()
        place = Located(cell, name or "header", source)
        if name in names and name:
            place.fault("names two columns.", "Keep one of the two.")
        elif name and name not in COLUMNS:
            place.fault("is not a known column.", MEANT.get(name) or source.nearest(name, COLUMNS))
        names.append(name if name in COLUMNS and name not in names else "")
    return names


def outside(cells: list[Scalar], columns: list[str], source: Source) -> None:
    """Say which cells stand in no column."""
    for cell in cells[len(columns) :]:
        if cell.text:
            place = Located(cell, "row", source)
            place.fault(
                f"holds {place.shown} to the right of the last column.",
                "Name the column, or quote a cell that holds the separator.",
            )


MEANT = {
    "cost": "Write 'per_unit' for a price per unit, or 'setup' for a price paid once.",
    "price": "Write 'per_unit' for a price per unit, or 'setup' for a price paid once.",
}
"""Keys and columns that people write by mistake, and what they may have meant."""

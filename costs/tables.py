"""Price lists as tables: CSV with either separator, and XLSX.

A row becomes the tree that YAML gives, so that one reader knows what a way is.
"""

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from costs.faults import Faults, Spot
from costs.files import NamedFile, fault_of, text_of
from costs.located import Entries, Items, Located, Node, Scalar, Source
from costs.workbooks import MOST_ROWS, Sheet, workbook_sheets

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
            (Scalar(cell.spot, column), cell)
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
    header = next((line for line in text.splitlines() if line.strip()), "")
    semicolons = ";" in header
    source = Source(str(file.path), faults, decimal_comma=semicolons)
    yield from rows_below_header(csv_cells(text, ";" if semicolons else ",", source), source)


def csv_cells(text: str, delimiter: str, source: Source) -> Iterator[list[Scalar]]:
    """Return the cells of each line; the row number is the line on which the row begins."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    begins = 1
    try:
        for number, cells in enumerate(reader):
            if number > MOST_ROWS:
                raise csv.Error(f"more than {MOST_ROWS:,} rows")  # noqa: TRY301 - told as the others
            yield [
                Scalar(Spot(begins, column), cell.strip()) for column, cell in enumerate(cells, 1)
            ]
            begins = reader.line_num + 1
    except csv.Error as error:
        mend = "Look for a quote that is not closed, or split the list into several files."
        wrong = f"is no price list in CSV here: {error}."
        source.faults.add(fault_of(Path(source.file), Spot(begins), wrong, mend))


def xlsx_rows(file: NamedFile, faults: Faults) -> tuple[list[Row], tuple[str, ...]]:
    """Return the rows of every price table, and the titles of sheets that hold something else."""
    source = Source(str(file.path), faults)
    sheets = [sheet for sheet in workbook_sheets(file, faults) if any(sheet.rows)]
    tables = [sheet for sheet in sheets if begins_with_columns(sheet)]
    if sheets and not tables:
        first = Located(Scalar(Spot(1, 1, "A1"), ""), "header", source)
        columns = ", ".join(COLUMNS)
        first.fault("no sheet begins with a row of column names.", f"Columns: {columns}.")
    rows = [row for sheet in tables for row in rows_below_header(iter(sheet.rows), source)]
    return rows, tuple(sheet.title for sheet in sheets if sheet not in tables)


def begins_with_columns(sheet: Sheet) -> bool:
    """Say whether the first row that holds something names columns of a price table."""
    first = next(row for row in sheet.rows if row)
    return bool({"variable", "component"} & {cell.text.casefold() for cell in first})


def rows_below_header(lines: Iterator[Sequence[Scalar]], source: Source) -> Iterator[Row]:
    """Return the rows below the first that holds something, which names the columns."""
    full = (cells for cells in lines if any(cell.text for cell in cells))
    header = next(full, None)
    if header is None:
        spot = Located(Scalar(Spot(1, 1), ""), "file", source)
        spot.fault("is empty.", f"Begin with a row of column names: {', '.join(COLUMNS)}.")
        return
    columns = columns_of(header, source)
    for cells in full:
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


def outside(cells: Sequence[Scalar], columns: list[str], source: Source) -> None:
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

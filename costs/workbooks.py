"""The cells of an XLSX workbook, as text with the place of each.

A formula is read as the text it is and never computed. A workbook is read as a stream, and one that
would unpack to far more than a price list holds, or says that it has rows without end, is refused.
"""

import io
import warnings
import zipfile
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from costs.faults import Faults, Spot
from costs.files import NamedFile, fault_of
from costs.located import Scalar

if TYPE_CHECKING:
    from openpyxl.worksheet._read_only import ReadOnlyWorksheet

__all__ = ["MOST_ROWS", "Sheet", "workbook_sheets"]

LARGEST_UNPACKED = 20_000_000
"""Bytes that a workbook may unpack to; 20,000 rows take about 10 MB."""
MOST_TEXTS = 200_000
"""Different texts in a workbook."""
MOST_ROWS = 20_000
"""Rows read of one table."""
MOST_COLUMNS = 100
"""Columns read of a sheet; a price list has fifteen."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """One sheet, row by row; a row ends with its last cell that holds something."""

    title: str
    rows: tuple[tuple[Scalar, ...], ...]


def workbook_sheets(file: NamedFile, faults: Faults) -> tuple[Sheet, ...]:
    """Return the sheets of a workbook; none, with a fault, if it cannot be read."""
    # Imported here: it takes a quarter of a second, and most studies have no workbook.
    from openpyxl import load_workbook  # noqa: PLC0415

    try:
        refuse_endless(file.content)
        with warnings.catch_warnings():
            # The library warns of features that it does not keep; nothing is written back here.
            warnings.simplefilter("ignore")
            book = load_workbook(io.BytesIO(file.content), read_only=True, data_only=False)
            many = len(book.worksheets) > 1
            return tuple(
                Sheet(sheet.title, tuple(rows_of(sheet, f"{sheet.title}!" if many else "")))
                for sheet in book.worksheets
            )
    except Exception as error:  # noqa: BLE001 - a damaged workbook can fail anywhere inside the library
        why = str(error) or type(error).__name__
        wrong = f"is no workbook that can be read: {why}."
        faults.add(fault_of(file.path, Spot(1, 1, "A1"), wrong, "Save it as XLSX again."))
        return ()


def refuse_endless(content: bytes) -> None:
    """Refuse an archive that would unpack to far more than a price list holds."""
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        if sum(part.file_size for part in archive.infolist()) > LARGEST_UNPACKED:
            raise ValueError(f"it unpacks to more than {LARGEST_UNPACKED // 10**6} MB")
        # The library keeps all texts at once, also those that no cell uses.
        texts = [part for part in archive.namelist() if part.lower().endswith("sharedstrings.xml")]
        if any(archive.read(part).count(b"<si") > MOST_TEXTS for part in texts):
            raise ValueError(f"it holds more than {MOST_TEXTS:,} texts")


def rows_of(sheet: "ReadOnlyWorksheet", prefix: str) -> Iterator[tuple[Scalar, ...]]:
    """Return the rows of a sheet; the library fills gaps between them with empty ones."""
    from openpyxl.utils import get_column_letter  # noqa: PLC0415

    sheet.reset_dimensions()  # what a workbook says of its own size may be wrong
    rows = sheet.iter_rows(values_only=True, max_col=MOST_COLUMNS)  # type: ignore[misc]  # stubs
    for row, values in enumerate(rows, 1):
        if row > MOST_ROWS:
            raise ValueError(f"sheet '{sheet.title}' has more than {MOST_ROWS:,} rows")
        last = max((at for at, value in enumerate(values, 1) if value is not None), default=0)
        yield tuple(
            Scalar(Spot(row, at, f"{prefix}{get_column_letter(at)}{row}"), cell_text(value))
            for at, value in enumerate(values[:last], 1)
        )


def cell_text(value: object) -> str:
    """Return what a cell holds as the text that a person would have written.

    Examples
    --------
    >>> cell_text(0.1 + 0.2), cell_text(12.0), cell_text(True)
    ('0.3', '12', 'yes')
    """
    match value:
        case None:
            return ""
        case bool():
            return "yes" if value else "no"
        case float():
            # A spreadsheet keeps fifteen digits; what comes after them is not meant.
            return f"{value:.15g}"
        case str() | int():
            return str(value).strip()
        case _ if type(value).__name__.endswith("Formula"):
            return f"={str(getattr(value, 'text', None) or '').removeprefix('=')}"
        case _:
            return str(value)

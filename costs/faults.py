"""One fault in one place of one file, and the one error that is meant for the user."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import NamedTuple

__all__ = ["Fault", "Faults", "FaultyInput", "Spot"]

MOST_COMPARISONS = 50_000
"""Looking for the nearest known name takes about 10 µs a name; half a second in all is enough."""


class Spot(NamedTuple):
    """A place inside a file; a named tuple, as a large file has hundreds of thousands of them."""

    row: int
    """Counted from 1."""
    column: int = 0
    """Counted from 1; 0 where the whole row is meant."""
    cell: str = ""
    """The name of the cell in a workbook, such as ``C4``; empty in a text file."""

    def __str__(self) -> str:
        return self.cell or str(self.row)


@dataclass(frozen=True, kw_only=True, slots=True)
class Fault:
    """One thing wrong in one place of one file, and how to mend it.

    Examples
    --------
    >>> fault = Fault(file="s.yaml", spot=Spot(4), key="budget", wrong="is -3.", mend="Write 3.")
    >>> print(fault)
    s.yaml:4: budget: is -3.
        Write 3.
    """

    file: str
    spot: Spot
    key: str
    wrong: str
    mend: str

    def __str__(self) -> str:
        return f"{self.file}:{self.spot}: {self.key}: {self.wrong}\n    {self.mend}"


class FaultyInput(Exception):  # noqa: N818 - the name says what happened, not that something did
    """What the user wrote cannot be used; carries every fault that was found."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(map(str, self.faults)))


class Faults:
    """Gathers faults, so that the author of a file can mend it in one go."""

    def __init__(self) -> None:
        self._found: list[Fault] = []
        self._comparisons = MOST_COMPARISONS

    def allow_comparisons(self, count: int) -> bool:
        """Say whether ``count`` more names may be compared with an unknown one, for a hint."""
        self._comparisons -= count
        return self._comparisons >= 0

    def add(self, fault: Fault) -> None:
        """Keep one fault."""
        self._found.append(fault)

    def spoil(self, file: str) -> bool:
        """Say whether so much of a file is at fault that what it lists is not all there."""
        return any(fault.file == file and fault.key in {"file", "header"} for fault in self._found)

    def __bool__(self) -> bool:
        return bool(self._found)

    def raise_any(self) -> None:
        """Raise ``FaultyInput`` if anything was found: file by file as read, then by place."""
        if self._found:
            files = dict.fromkeys(fault.file for fault in self._found)
            first = {file: number for number, file in enumerate(files)}
            raise FaultyInput(
                sorted(
                    dict.fromkeys(self._found),
                    key=lambda fault: (first[fault.file], fault.spot.row, fault.spot.column),
                )
            )

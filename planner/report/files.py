"""Writing a report to a file: whole or not at all, and never over another one unasked."""

import os
import tempfile
from collections.abc import Collection
from pathlib import Path

from costs.faults import Fault, FaultyInput, Spot

__all__ = ["refuse_overwriting", "write_whole"]


def refuse_overwriting(
    path: Path, option: str, mend: str, *, force: bool = False, inputs: Collection[str] = ()
) -> None:
    """Refuse a path at which no new file can be written.

    Parameters
    ----------
    mend
        What to do where there is a file already.
    force
        Whether an ordinary file may be replaced.
    inputs
        Files that were read, and are not replaced at any rate.

    Raises
    ------
    FaultyInput
        If the path is taken, or there is no folder to write into.
    """
    try:
        wrong = taken(path, force=force, inputs=inputs)
    except (OSError, ValueError) as error:
        wrong = f"cannot be written: {getattr(error, 'strerror', None) or error}."
    if wrong:
        raise refusal(path, option, wrong, mend)


def taken(path: Path, *, force: bool, inputs: Collection[str]) -> str:
    """Return why nothing can be written at a path; nothing if it is free."""
    if path.is_dir():
        return "is a folder."
    if os.path.lexists(path) and not path.is_file():
        return "is there already, and is no ordinary file."
    if path.exists() and any(path.samefile(each) for each in inputs if Path(each).exists()):
        return "is one of the files that were read."
    if path.exists() and not force:
        return "is there already."
    return "" if path.absolute().parent.is_dir() else "lies in a folder that is not there."


def write_whole(path: Path, content: bytes, option: str) -> None:
    """Write a file in one step, so that a run that is cut short leaves no half of it.

    Raises
    ------
    FaultyInput
        If the file cannot be written.
    """
    temporary = None
    try:
        # A link stays a link: what it leads to is replaced.
        target = path.resolve()
        handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=".measurewise-")
        with os.fdopen(handle, "wb") as file:
            file.write(content)
        # A temporary file is its owner's alone; what is handed over is readable as usual.
        umask = os.umask(0)
        os.umask(umask)
        Path(temporary).chmod(0o666 & ~umask)
        Path(temporary).replace(target)
    except OSError as error:
        if temporary is not None:
            Path(temporary).unlink(missing_ok=True)
        wrong = f"cannot be written: {error.strerror}."
        raise refusal(path, option, wrong, "Name another place.") from error


def refusal(path: Path, option: str, wrong: str, mend: str) -> FaultyInput:
    """Return the refusal of a path."""
    return FaultyInput([Fault(file=str(path), spot=Spot(1), key=option, wrong=wrong, mend=mend)])

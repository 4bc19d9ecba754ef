"""Writing a report to a file: whole or not at all, and never over another one unasked."""

import os
import tempfile
from pathlib import Path

from costs.faults import Fault, FaultyInput, Spot

__all__ = ["refuse_overwriting", "write_whole"]


def refuse_overwriting(path: Path, option: str, *, force: bool = False) -> None:
    """Refuse a path at which no new file can be written.

    Raises
    ------
    FaultyInput
        If there is a file already and ``force`` is not set, or there is no folder to write it into.
    """
    wrong = mend = ""
    if path.is_dir():
        wrong, mend = "is a folder.", "Name a file."
    elif path.exists() and not force:
        wrong, mend = "is there already.", "Name another file, or add --force to replace it."
    elif not path.absolute().parent.is_dir():
        wrong, mend = "lies in a folder that is not there.", "Make the folder first."
    if wrong:
        fault = Fault(file=str(path), spot=Spot(1), key=option, wrong=wrong, mend=mend)
        raise FaultyInput([fault])


def write_whole(path: Path, content: bytes, option: str) -> None:
    """Write a file in one step, so that a run that is cut short leaves no half of it.

    Raises
    ------
    FaultyInput
        If the file cannot be written.
    """
    temporary = None
    try:
        handle, temporary = tempfile.mkstemp(dir=path.absolute().parent, prefix=f".{path.name}.")
        with os.fdopen(handle, "wb") as file:
            file.write(content)
        # A temporary file is its owner's alone; what is handed over is readable as usual.
        umask = os.umask(0)
        os.umask(umask)
        Path(temporary).chmod(0o666 & ~umask)
        Path(temporary).replace(path)
    except OSError as error:
        if temporary is not None:
            Path(temporary).unlink(missing_ok=True)
        wrong = f"cannot be written: {error.strerror}."
        fault = Fault(
            file=str(path), spot=Spot(1), key=option, wrong=wrong, mend="Name another place."
        )
        raise FaultyInput([fault]) from error

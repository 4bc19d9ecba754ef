"""The time that a search may take, and how it tells of its progress."""

from collections.abc import Callable
from time import monotonic

__all__ = ["Deadline", "Tell", "tell_nobody"]

Tell = Callable[[str], None]
"""Is told what is being worked on."""


def tell_nobody(_: str) -> None:
    """Tell nobody what is being worked on."""


class Deadline:
    """The time that a search, or several in a row, may take."""

    def __init__(self, seconds: float) -> None:
        self._end = monotonic() + seconds

    @property
    def left(self) -> float:
        """Seconds that are left; never negative."""
        return max(0.0, self._end - monotonic())

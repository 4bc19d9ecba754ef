"""The time that a search may take."""

from time import monotonic

__all__ = ["Deadline"]


class Deadline:
    """The time that a search, or several in a row, may take."""

    def __init__(self, seconds: float) -> None:
        self._end = monotonic() + seconds

    @property
    def left(self) -> float:
        """Seconds that are left; never negative."""
        return max(0.0, self._end - monotonic())

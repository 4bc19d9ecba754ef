"""Things that come before each other in a circle."""

from collections.abc import Collection, Mapping
from graphlib import CycleError, TopologicalSorter

__all__ = ["circles"]


def circles(before: Mapping[str, Collection[str]]) -> list[list[str]]:
    """Return circles that share no member, each from a member back to itself.

    Parameters
    ----------
    before
        What stands directly before each name; a name that is no key has nothing before it.

    Examples
    --------
    >>> circles({"a": ["b"], "b": ["c"], "c": ["b"]})
    [['b', 'c', 'b']]
    """
    found = []
    left = {name: list(earlier) for name, earlier in before.items()}
    while True:
        try:
            TopologicalSorter(left).prepare()
        except CycleError as error:
            circle: list[str] = error.args[1]
            # From the smallest name on, so that the message does not hang on the order of the file.
            start = circle.index(min(circle))
            circle = circle[start:-1] + circle[: start + 1]
            found.append(circle)
            left = {
                name: [each for each in earlier if each not in circle]
                for name, earlier in left.items()
                if name not in circle
            }
        else:
            return found

"""Things that come before each other in a circle."""

from collections.abc import Collection, Mapping, Sequence
from graphlib import CycleError, TopologicalSorter

from costs.located import shortened

__all__ = ["circles", "spelt_out"]

MOST_CIRCLES = 20
"""Looking for one more takes as long as for the first; who has mended twenty can look again."""
MOST_SHOWN = 12
"""Members of one circle that are spelt out."""


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
    found: list[list[str]] = []
    left = {name: list(earlier) for name, earlier in before.items()}
    while len(found) < MOST_CIRCLES:
        try:
            TopologicalSorter(left).prepare()
        except CycleError as error:
            circle: list[str] = error.args[1]
            # From the smallest name on, so that the message does not hang on the order of the file.
            start = circle.index(min(circle))
            circle = circle[start:-1] + circle[: start + 1]
            found.append(circle)
            members = set(circle)
            left = {
                name: [each for each in earlier if each not in members]
                for name, earlier in left.items()
                if name not in members
            }
        else:
            break
    return found


def spelt_out(circle: Sequence[str], joint: str) -> str:
    """Return a circle as text; of a long one its beginning and its end.

    Examples
    --------
    >>> spelt_out(["a", "b", "a"], " → ")
    'a → b → a'
    """
    names = [shortened(name) for name in circle]
    if len(names) > MOST_SHOWN:
        names = [*names[: MOST_SHOWN - 2], f"… {len(names) - MOST_SHOWN + 1} more …", names[-1]]
    return joint.join(names)

"""Values that know their file, their place in it and their key.

A file of any kind (YAML, CSV, XLSX) is turned into one small tree of ``Scalar``, ``Items`` and
``Entries``; ``Located`` walks that tree and returns checked values. What is wrong is gathered as a
fault, and the getter returns None, so that reading goes on to the next fault.
"""

import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from decimal import Decimal
from difflib import get_close_matches
from fractions import Fraction
from types import MappingProxyType
from typing import NamedTuple
from unicodedata import category

from costs.faults import Fault, Faults, Spot

__all__ = [
    "Entries",
    "Items",
    "Located",
    "Node",
    "Scalar",
    "Source",
    "listed",
    "nearest",
    "shortened",
]

LARGEST_EXPONENT = 14
"""No number of 10^15 or more is read: it is a slip of the keyboard, or meant to do harm."""
MOST_PLACES = 15
"""No number is read with more decimals than this, whatever it counts."""

LONGEST_NUMBER = 40
"""Characters; a longer number is a slip, or meant to do harm."""
LONGEST_HINT = 100
"""Characters; for a longer name the nearest known one is not looked for."""

NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,4})?", re.ASCII)
EMPTY = frozenset({"", "~", "null", "Null", "NULL"})
INVISIBLE = frozenset({"Cf", "Zs"})
"""Kinds of characters that show nothing by themselves."""
TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")
"""Characters that turn the direction of the text after them, and so can forge what is shown."""
FLAGS = {"yes": True, "true": True, "no": False, "false": False}


class Scalar(NamedTuple):
    """A single value, as the text that was written."""

    spot: Spot
    text: str
    plain: bool = True
    """Not in quotes."""

    @property
    def is_empty(self) -> bool:
        """Whether nothing is given here (``key:`` or ``key: null``)."""
        return self.plain and self.text in EMPTY


class Items(NamedTuple):
    """A list of values."""

    spot: Spot
    items: tuple["Node", ...]


class Entries(NamedTuple):
    """A mapping, its pairs in the order of the file; a key may stand twice."""

    spot: Spot
    pairs: tuple[tuple["Node", "Node"], ...]


Node = Scalar | Items | Entries


@dataclass(frozen=True, slots=True)
class Source:
    """The file that a value is from, and where its faults go."""

    file: str
    faults: Faults
    decimal_comma: bool = False
    """Numbers are written 12,50."""

    def nearest(self, name: str, known: Collection[str]) -> str:
        """Return the known name that ``name`` may have been meant for, as a hint."""
        if len(name) > LONGEST_HINT or not self.faults.allow_comparisons(len(known)):
            return "Correct the name, or add what it stands for."
        return nearest(name, known)


@dataclass(frozen=True, slots=True)
class Located:
    """One value of a file with its place; faults are gathered, not raised."""

    node: Node
    key: str
    source: Source

    @property
    def is_empty(self) -> bool:
        """Whether nothing is given here."""
        return isinstance(self.node, Scalar) and self.node.is_empty

    @property
    def is_list(self) -> bool:
        """Whether a list is written here."""
        return isinstance(self.node, Items)

    @property
    def is_mapping(self) -> bool:
        """Whether ``key: value`` entries are written here."""
        return isinstance(self.node, Entries)

    @property
    def shown(self) -> str:
        """What is written here, in quotes, short enough for a message."""
        match self.node:
            case Scalar(text=text):
                return f"'{shortened(text)}'"
            case Items():
                return "a list"
            case Entries():
                return "a mapping"

    def fault(self, wrong: str, mend: str) -> None:
        """Say that something is wrong here, and how to mend it."""
        self.source.faults.add(
            Fault(
                file=self.source.file,
                spot=self.node.spot,
                key=self.key or "file",
                wrong=wrong,
                mend=mend,
            )
        )

    # ------------------------------------------------------------------ mappings and lists

    def named(self) -> "dict[str, Located]":
        """Return the entries of a mapping whose keys are names of the user's choice."""
        return {name: value for name, (_, value) in self._pairs().items()}

    def entries(
        self,
        known: Collection[str],
        later: Collection[str] = (),
        meant: Mapping[str, str] = MappingProxyType({}),
    ) -> "dict[str, Located]":
        """Return the entries of a mapping with fixed keys.

        Parameters
        ----------
        known
            The keys that may stand here; any other is a fault and left out.
        later
            Keys whose meaning is fixed but which cannot be used yet: a fault that says so.
        meant
            For keys that people write by mistake, a hint at what they may have meant.
        """
        found = {}
        for name, (key, value) in self._pairs().items():
            if name in known:
                found[name] = value
            elif name in later:
                key.fault(
                    "is reserved: its meaning is fixed, but it cannot be used yet.",
                    "Leave it out for now.",
                )
            else:
                hint = meant.get(name) or self.source.nearest(name, known)
                key.fault("is not a known key.", hint)
        return found

    def _pairs(self) -> "dict[str, tuple[Located, Located]]":
        """Return each key and its value by name; a key that stands twice is a fault."""
        if not isinstance(self.node, Entries):
            if not self.is_empty:
                self.fault(
                    f"is {self.shown}, where 'name: …' entries are wanted.",
                    "Write one entry a line, indented below.",
                )
            return {}
        found: dict[str, tuple[Located, Located]] = {}
        for key_node, value in self.node.pairs:
            if isinstance(key_node, Scalar) and key_node.plain and key_node.text == "<<":
                place = Located(key_node, self.key, self.source)
                place.fault("holds a merge key, which is not read.", "Write the entries out.")
                continue
            name = Located(key_node, self.key, self.source).name()
            if name is None:
                continue
            path = f"{self.key}.{shortened(name)}" if self.key else shortened(name)
            key = Located(key_node, path, self.source)
            if name in found:
                first = found[name][0].node.spot
                key.fault(f"stands here again, after line {first}.", "Keep one of the two.")
            else:
                found[name] = key, Located(value, path, self.source)
        return found

    def only(self, keys: Collection[str]) -> "Located":
        """Return the same mapping with these keys only, for a reader that knows no others."""
        assert isinstance(self.node, Entries), "only a mapping has keys"
        pairs = [
            (key, value)
            for key, value in self.node.pairs
            if isinstance(key, Scalar) and key.text.strip() in keys
        ]
        return Located(Entries(self.node.spot, tuple(pairs)), self.key, self.source)

    def below(self, key: str) -> "Located":
        """Return this place under the name of an entry that is not there, for a fault about it."""
        return Located(self.node, f"{self.key}.{key}" if self.key else key, self.source)

    def items(self) -> "tuple[Located, ...]":
        """Return the items of a list; a single value counts as a list of one."""
        match self.node:
            case Items(items=items):
                return tuple(Located(item, self.key, self.source) for item in items)
            case Scalar() if self.is_empty:
                return ()
            case Scalar():
                return (self,)
            case Entries():
                self.fault(
                    "is a mapping, where a list is wanted.", "Write it like [first, second]."
                )
                return ()

    def names(self) -> "dict[str, Located]":
        """Return the names in a list, each with its place; a name given twice is a fault."""
        found: dict[str, Located] = {}
        for item in self.items():
            name = item.name()
            if name is not None and name in found:
                item.fault(f"names '{shortened(name)}' twice.", "Keep one of the two.")
            elif name is not None:
                found[name] = item
        return found

    # ------------------------------------------------------------------------- single values

    def name(self) -> str | None:
        """Return a name: any single value, kept as the text that was written."""
        if not isinstance(self.node, Scalar):
            self.fault(
                f"is {self.shown}, where a name is wanted.", "Write a single word or number."
            )
            return None
        name = self.node.text.strip()
        if not name or (not name.isascii() and all(category(c) in INVISIBLE for c in name)):
            self.fault("is empty, where a name is wanted.", "Write a name.")
            return None
        if not name.isprintable() and any(is_control(c) or c in TURNING for c in name):
            self.fault(
                f"is {self.shown}, a name with a character that cannot be printed.",
                "Leave line breaks and control characters out of names.",
            )
            return None
        return name

    def text(self) -> str | None:
        """Return free text; None where nothing is written."""
        if self.is_empty:
            return None
        if not isinstance(self.node, Scalar):
            self.fault(
                f"is {self.shown}, where text is wanted.",
                "Write the text on one line, in quotes if it holds a colon.",
            )
            return None
        text = self.node.text
        if not text.isprintable() and any(is_control(c) and c not in "\n\r\t" for c in text):
            self.fault(f"is {self.shown}, with a control character.", "Take the character out.")
            return None
        return text

    def line(self) -> str | None:
        """Return free text on one line; None where nothing is written."""
        text = self.text()
        return None if text is None else " ".join(text.split())

    def flag(self) -> bool | None:
        """Return a yes or a no."""
        word = self.node.text.strip().lower() if isinstance(self.node, Scalar) else ""
        if word not in FLAGS:
            self.fault(f"is {self.shown}, where yes or no is wanted.", "Write yes or no.")
            return None
        return FLAGS[word]

    def choice(self, options: Collection[str]) -> str | None:
        """Return one of a few words."""
        word = self.name()
        if word is not None and word not in options:
            self.fault(f"is {self.shown}.", self.source.nearest(word, options))
            return None
        return word

    def number(
        self,
        *,
        least: Fraction | int | None = None,
        above: Fraction | int | None = None,
        most: Fraction | int | None = None,
        below: Fraction | int | None = None,
        places: int = MOST_PLACES,
    ) -> Fraction | None:
        """Return a number, exactly as written; None, with a fault, if it is none or out of bounds.

        Parameters
        ----------
        least, above, most, below
            Bounds: ``least`` and ``most`` may be reached, ``above`` and ``below`` may not.
        places
            The most decimals that it may have.
        """
        written = self._decimal()
        if written is None:
            return None
        if written.adjusted() > LARGEST_EXPONENT:
            self.fault(
                f"is {self.shown}, which is too large to be meant.",
                f"Write a number below 10^{LARGEST_EXPONENT + 1}.",
            )
            return None
        if decimals_of(written) > places:
            self.fault(
                f"is {self.shown}, with more than {places} decimals.",
                f"Round it to {places} decimals.",
            )
            return None
        value = Fraction(written)
        for is_out, bound in (
            (least is not None and value < least, f"{least} or more"),
            (above is not None and value <= above, f"above {above}"),
            (most is not None and value > most, f"{most} or less"),
            (below is not None and value >= below, f"below {below}"),
        ):
            if is_out:
                self.fault(
                    f"is {self.shown}, but must be {bound}.", f"Write a number that is {bound}."
                )
                return None
        return value

    def integer(self, *, least: int = 0, most: int | None = None) -> int | None:
        """Return a whole number within its bounds."""
        value = self.number(least=least, most=most)
        if value is not None and value.denominator != 1:
            self.fault(
                f"is {self.shown}, but must be a whole number.",
                f"Write a whole number, such as {round(value)}.",
            )
            return None
        return None if value is None else int(value)

    def _decimal(self) -> Decimal | None:
        text = self.node.text.strip() if isinstance(self.node, Scalar) else ""
        if self.source.decimal_comma and "." in text and NUMBER.fullmatch(text):
            self.fault(
                f"is {self.shown}: in a file separated by semicolons decimals take a comma.",
                f"Write it like {text.replace('.', ',')}, without marks between thousands.",
            )
            return None
        if self.source.decimal_comma:
            text = text.replace(",", ".")
        if text.startswith("="):
            self.fault(
                f"is the formula {self.shown}, and none is computed.", "Write the number itself."
            )
            return None
        if len(text) > LONGEST_NUMBER:
            self.fault(f"is {self.shown}, which is too long for a number.", "Round it.")
            return None
        if not NUMBER.fullmatch(text):
            wrong = (
                "is empty, where a number is wanted."
                if self.is_empty
                else f"is {self.shown}, which is no number."
            )
            self.fault(
                wrong,
                "Write it like 12,50." if self.source.decimal_comma else "Write it like 12.50.",
            )
            return None
        return Decimal(text)


def nearest(name: str, known: Collection[str]) -> str:
    """Return a hint at the known name that is nearest to ``name``.

    Examples
    --------
    >>> nearest("per_unt", ["per_unit", "setup"])
    "Did you mean 'per_unit'?"
    """
    folded = {each.casefold(): each for each in known}
    near = get_close_matches(name.casefold(), folded, n=1)
    if near:
        return f"Did you mean '{shortened(folded[near[0]])}'?"
    return f"Known here: {listed(known)}." if known else "Nothing is known here yet."


def decimals_of(number: Decimal) -> int:
    """Return how many decimals a number has, zeros at its end not counted.

    Examples
    --------
    >>> decimals_of(Decimal("12.50")), decimals_of(Decimal("1e3"))
    (1, 0)
    """
    if not number:
        return 0
    # Not by ``normalize``, which rounds to 28 digits.
    _, digits, exponent = number.as_tuple()
    assert isinstance(exponent, int), "the pattern admits no infinity and no nan"
    zeros = next(count for count, digit in enumerate(reversed(digits)) if digit)
    return max(0, -(exponent + zeros))


def is_control(char: str) -> bool:
    """Say whether a character breaks a line or controls a terminal; joiners of emoji do neither."""
    return category(char) in {"Cc", "Cs", "Zl", "Zp"}


def shortened(text: str, most: int = 60) -> str:
    """Return the text on one line, cut where it is longer than ``most`` characters."""
    if len(text) <= most and text.isprintable():
        return text
    line = "".join(" " if is_control(char) else char for char in text[: most + 1])
    return line if len(line) <= most else f"{line[: most - 1]}…"


def listed(names: Collection[str], most: int = 12) -> str:
    """Return the names, separated by commas, the first ``most`` of them."""
    first = [shortened(name) for name in list(names)[:most]]
    return ", ".join(first) + (f" and {len(names) - most} more" if len(names) > most else "")

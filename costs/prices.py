"""What can be bought and on what terms: ways of measuring, components, burdens."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction

__all__ = [
    "MOST_RECORDS",
    "STANDARD",
    "TEXTS",
    "Batch",
    "Burden",
    "Component",
    "Name",
    "PriceList",
    "Purchase",
    "Terms",
    "Way",
    "WayName",
    "shown_name",
]

MOST_RECORDS = 10**9
"""More complete records are out of reach."""
STANDARD = "standard"
"""The name of a variable's only way, where it has none of its own."""
TEXTS = (
    "definition",
    "measured_in",
    "source",
    "collected_by",
    "heading",
    "ask",
    "answers",
    "note",
)
"""Keys that are kept as text for the reports."""

WayName = tuple[str, str]
"""A variable and the name of one of its ways."""
Name = str | WayName
"""The name of a purchase: a component, or a variable and one of its ways."""


def shown_name(name: Name) -> str:
    """Return the name of a purchase as it stands in a bill.

    Examples
    --------
    >>> shown_name("extract"), shown_name(("days", "system"))
    ('extract', 'days.system')
    """
    return name if isinstance(name, str) else ".".join(name)


@dataclass(frozen=True, kw_only=True, slots=True)
class Batch:
    """Units are served in batches; a part batch is paid in full."""

    holds: int
    """Units that one batch serves."""
    price: Fraction

    def __post_init__(self) -> None:
        assert self.holds >= 1, "a batch holds at least one unit"


@dataclass(frozen=True, kw_only=True, slots=True)
class Purchase:
    """Something that is bought once, and then paid for unit by unit."""

    label: str = ""
    setup: Fraction = Fraction(0)
    per_unit: Fraction = Fraction(0)
    batch: Batch | None = None
    needs: tuple[str, ...] = ()
    """Components that must be bought with it."""
    takes: Mapping[str, Fraction] = field(default_factory=dict)
    """What one unit has to bear, by burden."""
    yields: Fraction = Fraction(1)
    """The share of units that comes through."""
    care: bool = False
    """It can hurt someone."""
    texts: Mapping[str, str] = field(default_factory=dict)
    """Any of ``TEXTS``."""

    def __post_init__(self) -> None:
        assert self.setup >= 0, "a set-up price is not negative"
        assert self.per_unit >= 0, "a price is not negative"
        assert 0 < self.yields <= 1, "a yield is a share above 0"


@dataclass(frozen=True, kw_only=True, slots=True)
class Way(Purchase):
    """A way of measuring one variable."""

    reliability: Fraction = Fraction(1)
    """Share of the variance of the readings that is variance of what is measured."""

    def __post_init__(self) -> None:
        # A dataclass with slots is made anew, and a bare ``super()`` would name the old one.
        Purchase.__post_init__(self)
        assert 0 < self.reliability <= 1, "a reliability is a share above 0"


@dataclass(frozen=True, kw_only=True, slots=True)
class Component(Purchase):
    """Something that several ways may share: a visit, a draw, an extract."""

    always: bool = False
    """Bought whatever is measured."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Burden:
    """Something that one unit has to bear, such as minutes or millilitres of blood."""

    label: str = ""
    price: Fraction = Fraction(0)
    """Paid for each of it."""
    limit: Fraction | None = None
    """The most that one unit may bear."""
    care: bool = False


@dataclass(frozen=True, kw_only=True, slots=True)
class PriceList:
    """Everything that can be bought.

    Every component that something needs is there, and no component needs itself, however far
    around (the reader of price lists says so with a line; here it is a promise).
    """

    ways: Mapping[str, Mapping[str, Way]]
    """By variable, then by the name of the way."""
    components: Mapping[str, Component]

    def purchase(self, name: Name) -> Purchase:
        """Return a component by its name, a way by its variable and name."""
        if isinstance(name, str):
            return self.components[name]
        variable, way = name
        return self.ways[variable][way]


@dataclass(frozen=True, kw_only=True, slots=True)
class Terms:
    """On how many units, with which losses and surcharges."""

    records: int
    """Complete records wanted."""
    usable: Fraction = Fraction(1)
    """Share of the complete records that can be used."""
    burdens: Mapping[str, Burden] = field(default_factory=dict)
    overhead: Fraction = Fraction(0)
    """Share of direct costs."""
    contingency: Fraction = Fraction(0)
    """Share of direct costs and overhead."""

    @property
    def surcharge(self) -> Fraction:
        """What direct costs are multiplied by to give the total."""
        return (1 + self.overhead) * (1 + self.contingency)

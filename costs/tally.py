"""Bills in whole numbers, for a solver that counts in 64 bits.

One in the tally is the largest unit of money that divides every price, so that nothing is rounded.
Prices have at most four decimals and burdens two: the unit is never below a millionth.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from costs.bill import bought, count_of, line_amount, reach, running_price, started_units
from costs.money import integer_scale
from costs.prices import PriceList, Purchase, Terms, WayName

__all__ = ["LARGEST_SUM", "MOST_STARTED", "Name", "Overflow", "Tally"]

LARGEST_SUM = 2**60
"""All lines together stay below this many units of the tally."""
MOST_STARTED = 10**10
"""No plan starts more units than this."""

Name = str | WayName
"""A component, or a variable and one of its ways."""


class Overflow(Exception):  # noqa: N818 - it names what happened
    """The amounts are too large to be added up in whole numbers."""

    def __init__(self, name: Name, unit: Fraction) -> None:
        self.name = name if isinstance(name, str) else ".".join(name)
        """The purchase of the largest amount."""
        self.unit = unit
        super().__init__(
            f"all amounts together reach 2^60 times {float(unit):g}, the largest amount of money"
            " that divides them all."
        )


@dataclass(frozen=True, slots=True)
class Tally:
    """What can be bought, counted in whole units of money."""

    prices: PriceList
    terms: Terms
    unit: Fraction
    """One in the tally is so much money."""
    names: tuple[Name, ...]
    """Ways, then components, in the order of the price list."""
    always: frozenset[str]
    """Components that every plan buys."""
    first_level: int
    """Units started where nothing lossy is bought but what always is."""
    reaches: dict[Name, Fraction]

    @classmethod
    def of(cls, prices: PriceList, terms: Terms) -> "Tally":
        """Return the tally of a price list."""
        ways = [(variable, way) for variable, named in prices.ways.items() for way in named]
        names: tuple[Name, ...] = (*ways, *prices.components)
        always = frozenset(bought((), prices))
        return cls(
            prices=prices,
            terms=terms,
            unit=integer_scale(
                part for name in names for part in _parts(prices.purchase(name), terms)
            ),
            names=names,
            always=always,
            first_level=started_units((prices.components[name].yields for name in always), terms),
            reaches={name: reach(prices.purchase(name), prices) for name in names},
        )

    def line(self, name: Name, started: int) -> int:
        """Return what a purchase comes to for so many units started, in whole units of money."""
        count = count_of(started, self.reaches[name])
        amount = line_amount(self.prices.purchase(name), count, self.terms) / self.unit
        assert amount.denominator == 1, "every price is a multiple of the unit"
        return amount.numerator

    def lines(self, started: int) -> dict[Name, int]:
        """Return what each purchase comes to.

        Raises
        ------
        Overflow
            If all together come to more than the solver can count.
        """
        lines = {name: self.line(name, started) for name in self.names}
        if sum(lines.values()) >= LARGEST_SUM or started > MOST_STARTED:
            raise Overflow(max(lines, key=lambda name: lines[name], default=""), self.unit)
        return lines


def _parts(purchase: Purchase, terms: Terms) -> Iterator[Fraction]:
    yield purchase.setup
    yield running_price(purchase, terms)
    if purchase.batch is not None:
        yield purchase.batch.price

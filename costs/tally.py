"""Bills in whole numbers, for a solver that counts in 64 bits.

One in the tally is the largest unit of money that divides every price, so that nothing is rounded.
Prices have at most four decimals and burdens two: the unit is never below a millionth.
"""

from bisect import bisect_left
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from costs.bill import bought, count_of, line_amount, reach, running_price, started_units
from costs.money import integer_scale
from costs.prices import Name, PriceList, Purchase, Terms

__all__ = ["LARGEST_SUM", "MOST_STARTED", "Overflow", "Tally"]

LARGEST_SUM = 2**60
"""All lines together stay below this many units of the tally."""
MOST_STARTED = 10**10
"""No plan starts more units than this."""


class Overflow(Exception):  # noqa: N818 - it names what happened
    """A plan is too large to be added up in whole numbers; the message says in what respect."""

    def __init__(self, wrong: str, name: Name | None = None) -> None:
        self.name = name
        """The purchase of the largest amount; None where the units started are too many."""
        super().__init__(wrong)


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
            If the units are too many, or all together come to more than the solver can count.
        """
        if started > MOST_STARTED:
            raise Overflow(f"leads to more than {MOST_STARTED:,} units that must be started.")
        lines = {name: self.line(name, started) for name in self.names}
        if sum(lines.values()) >= LARGEST_SUM:
            raise Overflow(
                "is too dear to be added up exactly: all amounts together reach 2^60 times"
                f" {float(self.unit):g}, the largest amount of money that divides them all.",
                max(lines, key=lambda name: lines[name]),
            )
        return lines

    def is_countable(self, started: int) -> bool:
        """Say whether a plan that starts so many units can be added up."""
        try:
            self.lines(started)
        except Overflow:
            return False
        return True

    def most_countable(self, some: int, too_many: int) -> int:
        """Return the most units for which plans can be added up, between two numbers."""
        numbers = range(some, too_many)
        return some + bisect_left(numbers, 1, key=lambda n: not self.is_countable(n)) - 1


def _parts(purchase: Purchase, terms: Terms) -> Iterator[Fraction]:
    yield purchase.setup
    yield running_price(purchase, terms)
    if purchase.batch is not None:
        yield purchase.batch.price

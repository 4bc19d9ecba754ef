"""What purchases come to, in floating point and from below: the money side of the bounds.

The exact bill is ``costs.bill``; here its lines are arrays, so that a bound takes microseconds.
With n complete records, s = n / kept units are started, and a purchase comes to

    setup + (running + batch price / holds) · reach · s

or more, since counts and batches are rounded up.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from costs.bill import needed_by, reach, running_price
from costs.prices import Name, PriceList, Terms

__all__ = ["Floats", "Till"]

Floats = NDArray[np.float64]
TINY = 1e-7
"""Forgiven before rounding up, so that a bound stays below what rounding errors make of it."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Till:
    """The prices of all purchases as arrays; surcharges included."""

    names: tuple[Name, ...]
    rows: dict[Name, int]
    setup: Floats
    running: Floats
    """Per unit that is reached, burdens included."""
    reach: Floats
    batch_price: Floats
    holds: Floats
    loss: Floats
    """1/yields − 1."""
    needs: NDArray[np.bool_]
    """Whether a purchase comes with another one, or is it."""
    usable: float

    @classmethod
    def of(cls, prices: PriceList, terms: Terms) -> "Till":
        """Return the till of a price list."""
        ways = [(variable, way) for variable, named in prices.ways.items() for way in named]
        names: tuple[Name, ...] = (*prices.components, *ways)
        rows = {name: row for row, name in enumerate(names)}
        bought = [prices.purchase(name) for name in names]
        surcharge = terms.surcharge
        needs = np.zeros((len(names), len(names)), dtype=bool)
        for name, row in rows.items():
            needs[row, row] = True
            for need in needed_by(prices.purchase(name).needs, prices):
                needs[row, rows[need]] = True
        return cls(
            names=names,
            rows=rows,
            setup=np.array([float(each.setup * surcharge) for each in bought]),
            running=np.array([float(running_price(each, terms) * surcharge) for each in bought]),
            reach=np.array([float(reach(each, prices)) for each in bought]),
            batch_price=np.array(
                [float(each.batch.price * surcharge) if each.batch else 0.0 for each in bought]
            ),
            holds=np.array([float(each.batch.holds) if each.batch else 1.0 for each in bought]),
            loss=np.array([float(1 / each.yields) - 1 for each in bought]),
            needs=needs,
            usable=float(terms.usable),
        )

    @property
    def per_unit(self) -> Floats:
        """What each purchase adds per unit started, batches spread evenly."""
        each: Floats = (self.running + self.batch_price / self.holds) * self.reach
        return each

    def closure(self, names: Iterable[Name]) -> NDArray[np.bool_]:
        """Return which purchases come with these."""
        rows = [self.rows[name] for name in names]
        return np.asarray(self.needs[rows].any(axis=0))

    def kept(self, bought: NDArray[np.bool_]) -> float:
        """Return the share of units started that end as usable records."""
        return float(self.usable / np.prod(1 + self.loss[bought]))

    def total(self, bought: NDArray[np.bool_], records: Floats) -> Floats:
        """Return what a purchase comes to for each number of records, counts rounded up."""
        started = np.ceil(records / self.kept(bought) * (1 - TINY))
        counts = np.ceil(started[:, None] * self.reach[bought] * (1 - TINY))
        batches = np.ceil(counts / self.holds[bought] * (1 - TINY))
        lines = self.running[bought] * counts + self.batch_price[bought] * batches
        found: Floats = lines.sum(axis=1) + self.setup[bought].sum()
        return found

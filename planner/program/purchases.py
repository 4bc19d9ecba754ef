"""The cost side of the program: what is bought, on how many units, and what it comes to.

    spent = Σ_p line_p(n₀) · buy_p + Σ_ℓ Σ_p (line_p(n_ℓ) − line_p(n_ℓ₋₁)) · both_pℓ           (1)

    Σ over ways w of v of buy_vw = measured_v ≤ 1                      for each variable       (2)
    buy_p ≤ buy_c                                                      for each need c of p    (3)
    Σ_p takes_p · buy_p ≤ limit                                        for each burden         (4)
    Σ_p loss_p · buy_p ≤ room_ℓ   unless beyond_ℓ                      for each level ℓ        (5)
    both_pℓ ≥ buy_p + beyond_ℓ − 1                                     for each level ℓ        (6)
    Σ_{p in cover} buy_p ≤ |cover| − 1   unless beyond_ℓ               for each cover          (7)
    spent ≤ budget / surcharge                                                                 (8)

For a given number of units started, a bill is linear in what is bought. ``n₀`` is that number where
nothing lossy is bought but what always is; every level ``n_ℓ`` is a larger number that some plan
needs, and ``beyond_ℓ`` says that the plan needs as many. Losses multiply, so their logarithms add
up: ``loss_p = −ln yield_p`` and ``room_ℓ = ln(kept₀ · (n_ℓ − 1) / records)``. Both are rounded in
favour of the plan, so that (1) is never above the exact bill. The bill of an answer is compared
with (1); where they differ, its level becomes part of the program, or, where rounding hid it, the
very combination of losses does (7), and the program is solved again. The size of the frame is a
level that must not be reached.
"""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from fractions import Fraction
from math import ceil, floor, log, prod

from costs.bill import Bill
from costs.prices import Name, shown_name
from costs.tally import Tally
from planner.program.model import Literal, Program, Term, negation
from planner.program.within import Within

__all__ = ["Shop", "write_purchases", "write_spending"]

LOG_SCALE = 2**40
"""Logarithms are counted in units of 2^-40."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Shop:
    """What can be bought within limits, and how finely the losses are told apart so far."""

    within: Within
    tally: Tally
    levels: tuple[int, ...] = ()
    """n_ℓ, rising; all above n₀."""
    covers: tuple[tuple[frozenset[Name], int], ...] = ()
    """Whoever buys all of these starts at least so many units."""
    most_started: int | None
    """Units that can be started at most: the size of the frame, or what can be counted."""
    is_cut: bool = False
    """What can be counted was less than the frame, and a plan met that needs more."""

    @classmethod
    def of(cls, within: Within) -> "Shop":
        """Return the shop of a search, before any losses are told apart."""
        tally = Tally.of(within.prices, within.terms)
        frame = within.frame_size
        if frame is None or frame >= tally.first_level:
            tally.lines(tally.first_level)  # raises where no plan can be added up
        levels = (frame + 1,) if frame is not None and frame >= tally.first_level else ()
        return cls(within=within, tally=tally, levels=levels, most_started=frame)

    @property
    def is_too_small(self) -> bool:
        """Whether the frame is too small for any plan at all."""
        return self.most_started is not None and self.most_started < self.tally.first_level

    def lossy(self, bill: Bill) -> frozenset[Name]:
        """Return what a bill buys with a yield below 1, what is always bought left out."""
        names: list[Name] = [*bill.ways, *bill.components]
        prices = self.within.prices
        return frozenset(
            name
            for name in names
            if prices.purchase(name).yields < 1 and name not in self.tally.always
        )

    def with_level(self, bill: Bill) -> "Shop":
        """Return the shop that knows how many units this bill starts."""
        level = bill.started
        if self.most_started is not None:
            level = min(level, self.most_started + 1)
        if level in self.levels:
            return replace(self, covers=(*self.covers, (self.lossy(bill), level)))
        if level != (self.most_started or 0) + 1 and not self.tally.is_countable(level):
            return self._cut(level)
        return replace(self, levels=tuple(sorted({*self.levels, level})))

    def _cut(self, too_many: int) -> "Shop":
        """Return the shop in which nobody starts more units than can be counted."""
        most = self.tally.most_countable(self.tally.first_level, too_many)
        levels = {level for level in self.levels if level <= most} | {most + 1}
        covers = tuple((names, min(level, most + 1)) for names, level in self.covers)
        return replace(
            self, levels=tuple(sorted(levels)), covers=covers, most_started=most, is_cut=True
        )


def write_purchases(program: Program, shop: Shop) -> dict[Name, Literal]:
    """Write (2) to (4) and return buy_p for each purchase."""
    buy = buy_literals(program, shop.tally)
    at_most_one_way(program, shop, buy)
    needs_come_along(program, shop, buy)
    burdens_are_kept(program, shop, buy)
    return buy


def write_spending(program: Program, shop: Shop, buy: dict[Name, Literal]) -> tuple[Term, ...]:
    """Write (5) to (8) and return (1), in whole units of the tally."""
    beyond = levels_are_reached(program, shop, buy)
    spent = tuple(spending(program, shop, buy, beyond))
    budget_is_kept(program, shop, spent)
    return spent


def buy_literals(program: Program, tally: Tally) -> dict[Name, Literal]:
    """Return buy_p for each purchase; what is always bought has no variable."""
    return {
        name: True if name in tally.always else program.literal(f"buy[{shown_name(name)}]")
        for name in tally.names
    }


def at_most_one_way(program: Program, shop: Shop, buy: dict[Name, Literal]) -> None:
    """(2)  Σ over ways w of v of buy_vw = measured_v ≤ 1."""
    for variable, ways in shop.within.prices.ways.items():
        program.measured[variable] = measured = program.literal(f"measured[{variable}]")
        literals = [buy[variable, way] for way in ways]
        program.exactly_one(f"one way[{variable}]", [*literals, negation(measured)])


def needs_come_along(program: Program, shop: Shop, buy: dict[Name, Literal]) -> None:
    """(3)  buy_p ≤ buy_c for each need c of p."""
    for name, literal in buy.items():
        for need in shop.within.prices.purchase(name).needs:
            program.clause(f"needs[{shown_name(name)}, {need}]", negation(literal), buy[need])


def burdens_are_kept(program: Program, shop: Shop, buy: dict[Name, Literal]) -> None:
    """(4)  Σ_p takes_p · buy_p ≤ limit, in hundredths."""
    for burden, terms in shop.within.terms.burdens.items():
        if terms.limit is not None:
            taken = [
                (int(100 * amount), literal)
                for name, literal in buy.items()
                if (amount := shop.within.prices.purchase(name).takes.get(burden))
            ]
            program.at_most(f"burden[{burden}]", taken, int(100 * terms.limit))


def levels_are_reached(
    program: Program, shop: Shop, buy: dict[Name, Literal]
) -> dict[int, Literal]:
    """(5) and (7): return beyond_ℓ for each level; the level above the frame is never reached."""
    tally, most = shop.tally, shop.most_started
    lossy = {
        name: loss(shop.within.prices.purchase(name).yields)
        for name in tally.names
        if name not in tally.always and shop.within.prices.purchase(name).yields < 1
    }
    beyond: dict[int, Literal] = {}
    for level in shop.levels:
        above = most is not None and level > most
        beyond[level] = False if above else program.literal(f"beyond[{level}]")
        losses = [(amount, buy[name]) for name, amount in lossy.items()]
        program.at_most(f"level[{level}]", losses, room(tally, level), unless=beyond[level])
    for names, level in shop.covers:
        some = [(1, buy[name]) for name in names]
        program.at_most(f"cover[{level}]", some, len(some) - 1, unless=beyond[level])
    return beyond


def loss(share: Fraction) -> int:
    """Return −ln share, rounded down."""
    return floor(-log(share) * LOG_SCALE) - 1


def room(tally: Tally, level: int) -> int:
    """Return the losses with which a plan still starts fewer units than the level, rounded up."""
    always = prod(
        (tally.prices.components[name].yields for name in tally.always), start=Fraction(1)
    )
    kept = tally.terms.usable * always
    return ceil(log(kept * (level - 1) / tally.terms.records) * LOG_SCALE) + 1


def spending(
    program: Program, shop: Shop, buy: dict[Name, Literal], beyond: dict[int, Literal]
) -> Iterable[Term]:
    """(1), with (6)  both_pℓ ≥ buy_p + beyond_ℓ − 1."""
    lines = shop.tally.lines(shop.tally.first_level)
    yield from ((lines[name], buy[name]) for name in buy)
    for level, reached in beyond.items():
        if reached is False:
            continue
        more = shop.tally.lines(level)
        for name, literal in buy.items():
            if more[name] > lines[name]:
                both = program.literal(f"both[{shown_name(name)}, {level}]")
                program.clause(
                    f"both[{shown_name(name)}, {level}]", both, negation(literal), negation(reached)
                )
                yield more[name] - lines[name], both
        lines = more


def budget_is_kept(program: Program, shop: Shop, spent: Iterable[Term]) -> None:
    """(8)  spent ≤ budget / surcharge."""
    if shop.within.budget is not None:
        most = floor(shop.within.budget / shop.within.terms.surcharge / shop.tally.unit)
        program.at_most("budget", spent, most)

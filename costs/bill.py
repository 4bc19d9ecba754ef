"""What a choice of ways costs, line by line, exactly.

kept     = usable · Π yields of everything bought
started  = ⌈records / kept⌉
count_p  = ⌈started · reach_p⌉     reach_p = Π yields of everything p needs, each once
line_p   = setup + per_unit · count_p + batch price · ⌈count_p / holds⌉
           + Σ over burdens of price · takes_p · count_p
total    = Σ_p line_p · (1 + overhead) · (1 + contingency)
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import ceil, prod

from costs.prices import Name, PriceList, Purchase, Terms, WayName, shown_name

__all__ = [
    "Bill",
    "Line",
    "bill_for",
    "bought",
    "count_of",
    "line_amount",
    "needed_by",
    "reach",
    "running_price",
    "started_units",
]

DIRECT = ("way", "component")
"""Kinds of lines that are costs of their own; the others are surcharges on them."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Line:
    """One line of a bill; its four parts add up to its amount."""

    kind: str
    """``way``, ``component``, ``overhead`` or ``contingency``."""
    name: str
    units: int
    """Units for which it is paid; 0 for a surcharge."""
    setup: Fraction
    per_unit: Fraction
    """Price per unit, times the units."""
    batches: Fraction
    burdens: Fraction

    @property
    def amount(self) -> Fraction:
        """What the line comes to."""
        return self.setup + self.per_unit + self.batches + self.burdens

    def share(self, kind: str, part: Fraction) -> "Line":
        """Return a surcharge of ``part`` on this line."""
        return Line(
            kind=kind,
            name=kind,
            units=0,
            setup=part * self.setup,
            per_unit=part * self.per_unit,
            batches=part * self.batches,
            burdens=part * self.burdens,
        )


@dataclass(frozen=True, kw_only=True, slots=True)
class Bill:
    """What a purchase comes to."""

    ways: tuple[WayName, ...]
    components: tuple[str, ...]
    """In the order of the price list."""
    records: int
    started: int
    kept: Fraction
    """Share of the units started that end as usable complete records."""
    lines: tuple[Line, ...]
    """Ways, components, then surcharges."""
    burdens: Mapping[str, Fraction]
    """What one unit has to bear in all."""
    next_unit: Fraction
    """What one more unit started adds before surcharges, batches left out."""

    @property
    def total(self) -> Fraction:
        """The sum of all lines."""
        return sum((line.amount for line in self.lines), Fraction(0))

    @property
    def setup(self) -> Fraction:
        """Set-up of ways and components, before surcharges."""
        return sum((line.setup for line in self.lines if line.kind in DIRECT), Fraction(0))


def needed_by(names: Iterable[str], prices: PriceList) -> frozenset[str]:
    """Return the named components and all that they need."""
    found: set[str] = set()
    stack = list(names)
    while stack:
        name = stack.pop()
        if name not in found:
            found.add(name)
            stack.extend(prices.components[name].needs)
    return frozenset(found)


def bought(ways: Iterable[WayName], prices: PriceList) -> tuple[str, ...]:
    """Return the components that come with the ways: what they need, and what is always bought.

    In the order of the price list.
    """
    always = [name for name, component in prices.components.items() if component.always]
    wanted = [name for way in ways for name in prices.purchase(way).needs]
    needed = needed_by(always + wanted, prices)
    return tuple(name for name in prices.components if name in needed)


def reach(purchase: Purchase, prices: PriceList) -> Fraction:
    """Return the share of the units started that a purchase still meets.

    Its own yield does not count: it is paid for before it fails.
    """
    return prod(
        (prices.components[name].yields for name in needed_by(purchase.needs, prices)),
        start=Fraction(1),
    )


def started_units(yields: Iterable[Fraction], terms: Terms) -> int:
    """Return how many units must be started so that enough usable records come out.

    Examples
    --------
    >>> started_units([Fraction("0.9")], Terms(records=400, usable=Fraction("0.8")))
    556
    """
    return ceil(terms.records / (terms.usable * prod(yields, start=Fraction(1))))


def count_of(started: int, share: Fraction) -> int:
    """Return the number of units for which a purchase that reaches this share is paid."""
    return ceil(started * share)


def running_price(purchase: Purchase, terms: Terms) -> Fraction:
    """Return what each unit costs, its burdens included."""
    burdens = (terms.burdens[name].price * taken for name, taken in purchase.takes.items())
    return purchase.per_unit + sum(burdens, Fraction(0))


def line_amount(purchase: Purchase, count: int, terms: Terms) -> Fraction:
    """Return what a purchase comes to for ``count`` units, before surcharges."""
    return Fraction(
        purchase.setup + running_price(purchase, terms) * count + _batches(purchase, count)
    )


def bill_for(ways: Iterable[WayName], prices: PriceList, terms: Terms) -> Bill:
    """Return the bill for measuring in these ways, with every component that they need."""
    ways = tuple(ways)
    components = bought(ways, prices)
    names: tuple[Name, ...] = (*ways, *components)
    purchases = [prices.purchase(name) for name in names]
    yields = [purchase.yields for purchase in purchases]
    started = started_units(yields, terms)
    reaches = [reach(purchase, prices) for purchase in purchases]
    direct = [
        _line(name, purchase, count_of(started, share), terms)
        for name, purchase, share in zip(names, purchases, reaches, strict=True)
    ]
    running = [running_price(purchase, terms) for purchase in purchases]
    return Bill(
        ways=ways,
        components=components,
        records=terms.records,
        started=started,
        kept=terms.usable * prod(yields, start=Fraction(1)),
        lines=(*direct, *_surcharges(direct, terms)),
        burdens=_borne(purchases, terms),
        next_unit=sum((a * b for a, b in zip(running, reaches, strict=True)), Fraction(0)),
    )


def _batches(purchase: Purchase, count: int) -> Fraction:
    if purchase.batch is None:
        return Fraction(0)
    return purchase.batch.price * ceil(Fraction(count, purchase.batch.holds))


def _line(name: Name, purchase: Purchase, count: int, terms: Terms) -> Line:
    return Line(
        kind="component" if isinstance(name, str) else "way",
        name=shown_name(name),
        units=count,
        setup=purchase.setup,
        per_unit=purchase.per_unit * count,
        batches=_batches(purchase, count),
        burdens=(running_price(purchase, terms) - purchase.per_unit) * count,
    )


def _surcharges(direct: Iterable[Line], terms: Terms) -> list[Line]:
    lines = list(direct)
    for kind, part in (("overhead", terms.overhead), ("contingency", terms.contingency)):
        if part:
            lines.append(_sum_of(lines).share(kind, part))
    return [line for line in lines if line.kind not in DIRECT]


def _sum_of(lines: Iterable[Line]) -> Line:
    lines = list(lines)
    return Line(
        kind="sum",
        name="sum",
        units=0,
        setup=sum((line.setup for line in lines), Fraction(0)),
        per_unit=sum((line.per_unit for line in lines), Fraction(0)),
        batches=sum((line.batches for line in lines), Fraction(0)),
        burdens=sum((line.burdens for line in lines), Fraction(0)),
    )


def _borne(purchases: Iterable[Purchase], terms: Terms) -> dict[str, Fraction]:
    borne = dict.fromkeys(terms.burdens, Fraction(0))
    for purchase in purchases:
        for name, taken in purchase.takes.items():
            borne[name] += taken
    return borne

"""Numbers as they are shown; a rounded number never claims more than the number."""

from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Decimal
from fractions import Fraction
from math import ceil, floor, isfinite

from planner.precision import FORGIVEN

__all__ = [
    "at_least",
    "at_most",
    "counted",
    "exact",
    "figure",
    "money",
    "percent",
    "percent_at_least",
    "percent_at_most",
    "price_of",
]

FIGURES = 3
"""Digits of a computed number that are shown."""
WRITTEN_OUT = 1e15
"""Numbers from here on are given by their power of ten."""


def money(amount: Fraction) -> str:
    """Return an amount with two decimals, or four where two would make it nothing.

    Examples
    --------
    >>> money(Fraction(12345, 10)), money(Fraction(1, 500)), money(Fraction(0))
    ('1,234.50', '0.0020', '0.00')
    """
    places = 4 if 0 < abs(amount) < Fraction(1, 200) else 2
    return f"{rounded(amount, places):,.{places}f}"


def exact_money(amount: Fraction) -> str:
    """Return an amount with two decimals, or with as many more as it has, up to six.

    Examples
    --------
    >>> exact_money(Fraction(1, 2)), exact_money(Fraction("0.375")), exact_money(Fraction(1234))
    ('0.50', '0.375', '1,234.00')
    """
    places = next((n for n in range(2, 6) if (amount * 10**n).denominator == 1), 6)
    return f"{rounded(amount, places):,.{places}f}"


def price_of(amount: Fraction, currency: str) -> str:
    """Return an amount of money with its currency, where it has one.

    Examples
    --------
    >>> price_of(Fraction(5), "EUR"), price_of(Fraction(5), "")
    ('5.00 EUR', '5.00')
    """
    return f"{money(amount)} {currency}".strip()


def rounded(amount: Fraction, places: int) -> Decimal:
    """Return an amount rounded to so many places, halves up."""
    return Decimal(floor(amount * 10**places + Fraction(1, 2))).scaleb(-places)


def exact(number: Fraction) -> str:
    """Return a number to its last digit, up to nine decimals.

    Examples
    --------
    >>> exact(Fraction(3)), exact(Fraction("799.999")), exact(Fraction("120453.8"))
    ('3', '799.999', '120,453.8')
    """
    shown = f"{rounded(number, 9):,.9f}"
    return shown.rstrip("0").rstrip(".")


def percent(share: Fraction) -> str:
    """Return a share in per cent with one decimal; 0 and 100 only for none and all.

    Examples
    --------
    >>> percent(Fraction(9999, 10000)), percent(Fraction(1)), percent(Fraction(28, 100))
    ('99.9 %', '100 %', '28 %')
    """
    tenths = 1000 * share
    shown = ceil(tenths) if tenths < Fraction(1, 2) else floor(tenths + Fraction(1, 2))
    if share < 1:
        shown = min(shown, 999)
    return f"{shown / 10:g} %"


def percent_at_most(share: float, places: int = 1) -> str:
    """Return a computed share in per cent that is not below it, with so many decimals at most.

    Examples
    --------
    >>> percent_at_most(0.15001), percent_at_most(0.05000000000001), percent_at_most(0.00004)
    ('15.1 %', '5 %', '0.1 %')
    """
    unit = 10**places
    return f"{ceil(100 * unit * share * (1 - FORGIVEN)) / unit:,.10g} %"


def percent_at_least(chance: float) -> str:
    """Return a computed chance in per cent that is not above it, with one decimal; never all.

    Examples
    --------
    >>> percent_at_least(0.80119), percent_at_least(0.8 - 1e-12), percent_at_least(0.999999)
    ('80.1 %', '80 %', '99.9 %')
    >>> percent_at_least(0.0004)
    'below 0.1 %'
    """
    tenths = min(floor(1000 * chance * (1 + FORGIVEN)), 999)
    return f"{tenths / 10:g} %" if tenths else "below 0.1 %"


def figure(number: float, rounding: str = ROUND_HALF_EVEN) -> str:
    """Return a computed number with three digits, or all of its whole ones, as a person writes it.

    Examples
    --------
    >>> figure(-0.18000000000000002), figure(0.00012345), figure(12345.6), figure(0.0)
    ('-0.18', '0.000123', '12,346', '0')
    """
    if not isfinite(number):
        return "without end"
    if not number or abs(number) >= WRITTEN_OUT:
        return f"{number:.3g}"
    exactly = Decimal(repr(float(number)))
    places = max(0, FIGURES - 1 - exactly.adjusted())
    shown = f"{exactly.quantize(Decimal(1).scaleb(-places), rounding):,f}"
    return shown.rstrip("0").rstrip(".") if places else shown


def at_most(number: float) -> str:
    """Return a computed positive number that is rounded up: a width that is kept.

    Examples
    --------
    >>> at_most(0.12573), at_most(0.05000000000001), at_most(float("inf"))
    ('0.126', '0.05', 'without end')
    """
    return figure(number * (1 - FORGIVEN), ROUND_CEILING)


def at_least(number: float) -> str:
    """Return a computed positive number that is rounded down: a strength that is reached.

    Examples
    --------
    >>> at_least(227.93), at_least(19.9999999999999), at_least(9.876)
    ('227', '20', '9.87')
    """
    return figure(number * (1 + FORGIVEN), ROUND_FLOOR)


def counted(number: int, thing: str, plural: str = "") -> str:
    """Return a number of things.

    Examples
    --------
    >>> counted(1, "variable"), counted(2000, "variable")
    ('1 variable', '2,000 variables')
    """
    return f"{number:,} {thing if number == 1 else plural or thing + 's'}"

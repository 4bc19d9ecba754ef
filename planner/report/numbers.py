"""Numbers as they are shown; a rounded number never claims more than the number."""

from decimal import Decimal
from fractions import Fraction
from math import ceil, floor

__all__ = ["counted", "exact", "money", "percent"]


def money(amount: Fraction) -> str:
    """Return an amount with two decimals, or four where two would make it nothing.

    Examples
    --------
    >>> money(Fraction(12345, 10)), money(Fraction(1, 500)), money(Fraction(0))
    ('1,234.50', '0.0020', '0.00')
    """
    places = 4 if 0 < abs(amount) < Fraction(1, 200) else 2
    return f"{rounded(amount, places):,.{places}f}"


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


def counted(number: int, thing: str, plural: str = "") -> str:
    """Return a number of things.

    Examples
    --------
    >>> counted(1, "variable"), counted(2000, "variable")
    ('1 variable', '2,000 variables')
    """
    return f"{number:,} {thing if number == 1 else plural or thing + 's'}"

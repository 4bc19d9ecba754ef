"""Exact money: amounts are fractions inside, and whole numbers of a stated unit for the solver."""

from collections.abc import Iterable
from fractions import Fraction
from math import gcd

__all__ = ["integer_scale", "plain_number"]


def integer_scale(amounts: Iterable[Fraction]) -> Fraction:
    """Return the largest unit of which every amount is a whole multiple; 1 if all are 0.

    Prices have at most four decimals and burdens two more, so the unit is never below one
    millionth; where all prices are whole hundreds it is a hundred or more.

    Examples
    --------
    >>> integer_scale([Fraction("12.50"), Fraction("0.75"), Fraction(3)])
    Fraction(1, 4)
    >>> integer_scale([Fraction(3000), Fraction(40)])
    Fraction(40, 1)
    """
    numerator, denominator = 0, 1
    for amount in amounts:
        # The greatest common divisor of two fractions, over their common denominator.
        common = denominator * amount.denominator // gcd(denominator, amount.denominator)
        numerator = gcd(
            numerator * (common // denominator), amount.numerator * (common // amount.denominator)
        )
        denominator = common
    return Fraction(numerator, denominator) if numerator else Fraction(1)


def plain_number(amount: Fraction) -> int | float:
    """Return the amount as a number for JSON: whole where it is whole, else the nearest float.

    Examples
    --------
    >>> plain_number(Fraction(5, 2)), plain_number(Fraction(4, 2))
    (2.5, 2)
    """
    return int(amount) if amount.denominator == 1 else float(amount)

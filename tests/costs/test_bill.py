"""Bills, line by line, each worked out beside it."""

from fractions import Fraction

import pytest

from costs.bill import Line, bill_for, bought, line_amount, reach, started_units
from costs.prices import Batch, Burden, Component, PriceList, Terms, Way
from costs.tally import Tally


def half(amount: str) -> Fraction:
    """An exact number."""
    return Fraction(amount)


@pytest.mark.parametrize(
    ("records", "yields", "started"),
    [
        # Attrition: n / (1 - a) and n / k^w; any text on sampling. 200 at 20 %: 250; two waves that
        # keep nine in ten: 400 / 0.81 = 494.
        (200, ["0.8"], 250),
        (400, ["0.9", "0.9"], 494),
        (450, ["0.9"], 500),
        (1, ["0.001"], 1000),
    ],
)
def test_losses_multiply(records: int, yields: list[str], started: int) -> None:
    assert started_units(map(Fraction, yields), Terms(records=records)) == started


PRICES = PriceList(
    ways={
        "x": {"w": Way(per_unit=half("1.50"), needs=("visit",), takes={"minutes": half("4")})},
        "c": {"w": Way(setup=half("100"), needs=("tube",), yields=half("0.9"))},
    },
    components={
        "base": Component(always=True, setup=half("1000"), per_unit=half("2"), yields=half("0.5")),
        "visit": Component(per_unit=half("10"), needs=("base",), yields=half("0.8")),
        "tube": Component(batch=Batch(holds=40, price=half("60")), needs=("visit",)),
        "idle": Component(setup=half("9")),
    },
)
TERMS = Terms(
    records=100,
    usable=half("0.9"),
    burdens={"minutes": Burden(price=half("0.5"), limit=half("9"))},
    overhead=half("0.2"),
    contingency=half("0.1"),
)


def test_a_bill_follows_its_definition() -> None:
    """kept = 0.9 · 0.9 · 0.5 · 0.8 = 0.324; started = ⌈100 / 0.324⌉ = 309.

    base: 309 units, 1000 + 618. visit: ⌈154.5⌉ = 155 units, 1550. x and tube and c reach 0.4:
    ⌈123.6⌉ = 124 units. x: 124 · (1.5 + 4 · 0.5) = 434. tube: ⌈124 / 40⌉ = 4 plates, 240. c: 100.
    """
    bill = bill_for([("x", "w"), ("c", "w")], PRICES, TERMS)
    assert (bill.started, bill.kept) == (309, half("0.324"))
    assert bill.components == ("base", "visit", "tube")
    assert [(line.name, line.units, line.amount) for line in bill.lines[:-2]] == [
        ("x.w", 124, 434),
        ("c.w", 124, 100),
        ("base", 309, 1618),
        ("visit", 155, 1550),
        ("tube", 124, 240),
    ]
    assert bill.lines[0] == Line(
        kind="way",
        name="x.w",
        units=124,
        setup=half("0"),
        per_unit=half("186"),
        batches=half("0"),
        burdens=half("248"),
    )
    # 3942 in all; a fifth of it; a tenth of both
    assert [(line.name, line.amount) for line in bill.lines[-2:]] == [
        ("overhead", half("788.4")),
        ("contingency", half("473.04")),
    ]
    assert bill.total == half("5203.44")
    assert bill.setup == 1100
    # one more unit: base 2, visit 10 of half, x 3.5 of two fifths
    assert bill.next_unit == 2 + 5 + half("1.4")
    assert bill.burdens == {"minutes": 4}


def test_every_line_is_the_sum_of_its_parts() -> None:
    bill = bill_for([("x", "w"), ("c", "w")], PRICES, TERMS)
    for line in bill.lines:
        assert line.setup + line.per_unit + line.batches + line.burdens == line.amount
    assert sum(line.amount for line in bill.lines) == bill.total


def test_what_is_needed_comes_along_once() -> None:
    assert bought([("x", "w"), ("c", "w")], PRICES) == ("base", "visit", "tube")
    assert bought([], PRICES) == ("base",)
    assert reach(PRICES.components["tube"], PRICES) == half("0.4")
    assert reach(PRICES.components["base"], PRICES) == 1


def test_the_tally_counts_the_same_in_whole_numbers() -> None:
    tally = Tally.of(PRICES, TERMS)
    assert tally.first_level == 223  # 100 / (0.9 · 0.5)
    assert tally.always == {"base"}
    for started in (223, 309, 310):
        for name, amount in tally.lines(started).items():
            units = -(-started * tally.reaches[name].numerator // tally.reaches[name].denominator)
            assert amount * tally.unit == line_amount(PRICES.purchase(name), units, TERMS)


def test_the_tally_of_nothing_to_pay_is_nothing() -> None:
    free = PriceList(ways={"x": {"w": Way()}}, components={})
    assert Tally.of(free, Terms(records=1)).lines(1) == {("x", "w"): 0}

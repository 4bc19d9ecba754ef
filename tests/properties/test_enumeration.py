"""The integer program against trying everything, on 500 random studies.

``enumeration.py`` shares no code with the packages: separation is networkx's, bills and criteria
are written out anew. Every answer is compared in full: status, total, units started, who is
measured in which way, and which route is recommended.
"""

from collections import Counter
from collections.abc import Callable
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from planner import read_study, recommend
from planner.plan import Recommendation, RouteAnswer
from tests.enumeration import ROUTES, Best, Enumeration, limits_in
from tests.random_studies import random_study, text_of

SEEDS = range(500)
CHUNK = 20
WANTED = 100
"""Studies, of the 500, in which each thing that could go wrong has to matter."""


@cache
def enumerated(seed: int) -> tuple[dict[str, Any], dict[str, Best | None], dict[str, Best | None]]:
    """The limits of a study, and the cheapest purchase by each route within them and without."""
    study = random_study(seed)
    everything = Enumeration(study)
    limits = limits_in(study)
    within = {route: everything.best(route, limits) for route in ROUTES}
    return limits, within, {route: everything.best(route, {}) for route in ROUTES}


@pytest.mark.parametrize("first", SEEDS[::CHUNK])
def test_answers_are_those_of_trying_everything(first: int, write: Callable[..., Path]) -> None:
    for seed in range(first, first + CHUNK):
        answer = recommend(read_study(write(text_of(random_study(seed)))))
        limits, within, without = enumerated(seed)
        for route in answer.effects[0].routes:
            agrees(route, within[route.route], without[route.route], seed)
            if route.status == "over_limits":
                explains_limits(route, limits, seed)
        recommends_the_cheapest(answer, within, seed)


def agrees(route: RouteAnswer, within: Best | None, without: Best | None, seed: int) -> None:
    """One route's answer is the cheapest of all purchases that open it."""
    if within is None:
        assert route.status == ("over_limits" if without else "impossible"), (seed, route.route)
        return
    assert route.plan is not None, (seed, route.route)
    bill = route.plan.buy.bill
    assert (bill.total, bill.started) == (within.total, within.started), (seed, route.route)
    assert dict(route.plan.buy.measure) == within.measure, (seed, route.route)
    assert route.plan.buy.proved
    assert route.plan.buy.lower_bound == bill.total
    roles = route.plan.covariates + route.plan.instruments + route.plan.mediators
    assert sorted((*roles, "x", "y")) == sorted(within.measure), (seed, route.route)


def explains_limits(route: RouteAnswer, limits: dict[str, Any], seed: int) -> None:
    """What is said to be in the way is, and the plan beyond is the cheapest without it."""
    everything = Enumeration(random_study(seed))
    names = {"minutes": "burdens.minutes"}
    alone = {
        names.get(limit, limit): best
        for limit in limits
        if (best := everything.best(route.route, {k: v for k, v in limits.items() if k != limit}))
    }
    assert route.beyond is not None, (seed, route.route)
    if alone:
        assert {each.limit for each in route.exceeds} == set(alone), (seed, route.route)
        assert route.beyond.buy.bill.total == min(best.total for best in alone.values())
    else:
        free = everything.best(route.route, {})
        assert free is not None
        assert route.beyond.buy.bill.total == free.total
        assert len(route.exceeds) > 1, (seed, route.route)
    for each in route.exceeds:
        if each.limit == "least_reliability":
            assert each.needed < each.allowed
        else:
            assert each.needed > each.allowed
        if each.limit == "budget" and alone:
            assert each.needed == alone["budget"].total


def recommends_the_cheapest(
    answer: Recommendation, within: dict[str, Best | None], seed: int
) -> None:
    """The recommendation is the best of the routes; a tie goes to fewer variables, then names."""
    found = [(best.key[:3], ROUTES.index(route)) for route, best in within.items() if best]
    if not found:
        assert answer.buy is None
        assert answer.status in {"over_limits", "impossible", "no_effect"}
        return
    (total, _, names), place = min(found)
    assert answer.effects[0].recommended == ROUTES[place], seed
    assert answer.buy is not None
    assert answer.buy.bill.total == total
    assert sorted(answer.buy.measure) == list(names)
    assert answer.buy.proved


def additive_total(seed: int, route: str) -> Fraction | None:
    """What the purchase costs that looks cheapest when every way pays for its own components."""
    study = random_study(seed)
    everything = Enumeration(study)
    bills, limits = everything.bills, limits_in(study)
    records = study["size"]["records"]

    def by_itself(name: str, way: str) -> Fraction:
        entry = bills.ways(name)[way]
        needs = [bills.components[need] for need in bills.needs(entry)]
        return sum((bills.line(part, records) for part in [entry, *needs]), Fraction(0))

    found = []
    for opening in everything.open_by[route]:
        measure = {
            name: min(bills.ways(name), key=lambda way, name=name: by_itself(name, way))
            for name in opening | {"x", "y"}
        }
        looks = sum((by_itself(name, way) for name, way in measure.items()), Fraction(0))
        bill = bills.of(measure, limits)
        if bill is not None:
            found.append((looks, bill[0]))
    return min(found)[1] if found else None


def test_the_500_studies_ask_for_everything(capsys: pytest.CaptureFixture[str]) -> None:
    """A comparison on studies that any program would get right would prove nothing."""
    counts: Counter[str] = Counter()
    for seed in SEEDS:
        _, within, without = enumerated(seed)
        everything = Enumeration(random_study(seed))
        x, y = everything.x, everything.y
        company = {
            route: set(best.measure) - {x, y} for route, best in without.items() if best is not None
        }
        counts["conditioning needs two or more covariates"] += (
            len(company.get("conditioning", ())) > 1
        )
        counts["an instrument needs a covariate"] += len(company.get("instrument", ())) > 1
        counts["a mechanism needs a covariate or two mediators"] += (
            len(company.get("mechanism", ())) > 1
        )
        counts["a limit binds"] += any(
            without[route] is not None
            and (within[route] is None or within[route].key != without[route].key)
            for route in ROUTES
        )
        counts["components decide"] += any(
            best is not None
            and (additive := additive_total(seed, route)) is not None
            and additive > best.total
            for route, best in within.items()
        )
    with capsys.disabled():
        print()
        for what, count in counts.items():
            print(f"    {count} of {len(SEEDS)} random studies: {what}")
    assert len(counts) == 5
    assert min(counts.values()) >= WANTED, counts

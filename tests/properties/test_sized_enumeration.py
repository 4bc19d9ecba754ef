"""The joint search against trying everything, on 200 random studies at a stated precision.

``sized_enumeration.py`` shares no code with the packages. Every answer is compared in full: status,
total, records, units started, who is measured in which way and which role, which route is
recommended; and where a limit is in the way, which, and what the cheapest plan without it needs.
"""

from collections import Counter
from collections.abc import Callable
from functools import cache
from math import isclose
from pathlib import Path
from typing import Any

import pytest

from planner import read_study, recommend
from planner.plan import Recommendation, RouteAnswer
from tests.enumeration import ROUTES
from tests.random_studies import sized_study, text_of
from tests.sized_enumeration import SizedEnumeration, Study

SEEDS = range(200)
CHUNK = 10
MONEY_SEEDS = [
    seed
    for seed in range(500, 600)
    if sum("ways" in each for each in sized_study(seed)["variables"].values()) <= 7
][:40]
FLOORS = ("least_reliability", "first_stage_F")


@cache
def enumerated(seed: int) -> SizedEnumeration:
    """Everything that could be done in a study."""
    return SizedEnumeration(sized_study(seed))


@cache
def within(seed: int, route: str) -> Study | None:
    """The cheapest study on a route, within all limits."""
    everything = enumerated(seed)
    return everything.best(route, everything.limits(route))


@cache
def without(seed: int, route: str) -> dict[str, Study]:
    """The cheapest studies on a route without one limit each, where there are any."""
    everything = enumerated(seed)
    limits = everything.limits(route)
    found = {
        limit: everything.best(route, {k: v for k, v in limits.items() if k != limit})
        for limit in limits
    }
    return {limit: study for limit, study in found.items() if study is not None}


@pytest.mark.parametrize("first", SEEDS[::CHUNK])
def test_answers_are_those_of_trying_everything(first: int, write: Callable[..., Path]) -> None:
    for seed in range(first, first + CHUNK):
        answer = recommend(read_study(write(text_of(sized_study(seed)))))
        for route in answer.effects[0].routes:
            agrees(route, seed)
        recommends_the_cheapest(answer, seed)


def agrees(route: RouteAnswer, seed: int) -> None:
    """One route's answer is the cheapest of all studies."""
    best, where = within(seed, route.route), (seed, route.route)
    if best is None:
        explains_limits(route, seed)
        return
    assert route.status == "feasible", where
    assert route.plan is not None
    buy, plan = route.plan.buy, route.plan
    assert (buy.bill.total, buy.bill.records) == (best.total, best.records), where
    assert buy.bill.started == best.started, where
    assert dict(buy.measure) == best.measure, where
    roles = plan.covariates, plan.instruments, plan.mediators
    assert roles == (best.roles.covariates, best.roles.instrument, best.roles.mediators), where
    assert buy.proved, where
    achieves(route, best, enumerated(seed), where)


def achieves(route: RouteAnswer, best: Study, everything: SizedEnumeration, where: Any) -> None:
    """What a plan says of its precision is what it comes to."""
    assert route.plan is not None
    told = route.plan.precision
    assert told is not None, where
    assert isclose(told.bias_bound, best.bias, rel_tol=1e-7, abs_tol=1e-9), where
    scale = everything.model.scale
    assert isclose(told.effect, everything.model.effect * scale, rel_tol=1e-9), where
    width = everything.half_width(best)
    assert isclose(told.half_width, width, rel_tol=1e-7), where
    if route.route == "instrument":
        reached = best.records * best.f_per_record / everything.design_effect_of(route.route)
        assert told.first_stage_f is not None
        assert isclose(told.first_stage_f, reached, rel_tol=1e-7), where


def explains_limits(route: RouteAnswer, seed: int) -> None:
    """What is said to be in the way is, and the plan beyond is the cheapest without it."""
    everything, where = enumerated(seed), (seed, route.route)
    limits, alone = everything.limits(route.route), without(seed, route.route)
    free = everything.best(route.route, {})
    if free is None:
        is_open = bool(everything.drafts(route.route).roles)
        assert route.status == "impossible", where
        assert (route.reason.kind == "out_of_reach") == is_open, where
        return
    assert route.status == "over_limits", where
    assert route.beyond is not None, where
    beyond = min(alone.values(), key=lambda study: study.key) if alone else free
    assert route.beyond.buy.bill.total == beyond.total, where
    if not alone:
        assert len(route.exceeds) > 1, where
        assert {each.limit for each in route.exceeds} == broken(free, limits, everything), where
        return
    assert {each.limit for each in route.exceeds} == set(alone), where
    for each in route.exceeds:
        plan = alone[each.limit]
        if each.limit == "budget":
            assert each.needed == plan.total, where
        elif each.limit == "frame_size":
            assert each.needed == plan.started, where
        elif each.limit == "records":
            assert each.needed == plan.records, where
        elif each.limit == "bias":
            assert isclose(each.needed, plan.bias, rel_tol=1e-7), where
        is_less = each.needed < each.allowed
        assert is_less == (each.limit in FLOORS), where


def broken(study: Study, limits: dict[str, Any], everything: SizedEnumeration) -> set[str]:
    """The limits that a study breaks."""
    deff = everything.design_effect_of("instrument") if study.roles.instrument else 1.0
    needs = {
        "budget": float(study.total),
        "frame_size": study.started,
        "bias": study.bias,
        "records": study.records,
        "burdens.minutes": float(study.minutes),
        "least_reliability": -float(study.reliability),
        "first_stage_F": -study.records * study.f_per_record / deff,
    }
    signs = {limit: -1 if limit in FLOORS else 1 for limit in limits}
    slack = {limit: 1e-9 * abs(float(allowed)) for limit, allowed in limits.items()}
    return {
        limit
        for limit, allowed in limits.items()
        if needs[limit] > signs[limit] * float(allowed) + slack[limit]
    }


def recommends_the_cheapest(answer: Recommendation, seed: int) -> None:
    """The recommendation is the best of the routes; a tie goes to fewer variables, then names."""
    found = [
        (best.key[:3], number)
        for number, route in enumerate(ROUTES)
        if (best := within(seed, route)) is not None
    ]
    if not found:
        assert answer.buy is None
        return
    (total, _, names), number = min(found)
    assert answer.effects[0].recommended == ROUTES[number], seed
    assert answer.buy is not None
    assert answer.buy.bill.total == total
    assert sorted(answer.buy.measure) == names
    assert answer.buy.proved


@pytest.mark.parametrize("first", range(0, 40, CHUNK))
def test_money_buys_the_narrowest_interval(first: int, write: Callable[..., Path]) -> None:
    assert len(MONEY_SEEDS) == 40
    found = 0
    for seed in MONEY_SEEDS[first : first + CHUNK]:
        study = sized_study(seed)
        study["size"] = {"spend": study.pop("budget", 5000 + 500 * (seed - 500))}
        answer = recommend(read_study(write(text_of(study))))
        everything = SizedEnumeration(study)
        for route in answer.effects[0].routes:
            limits, where = everything.limits(route.route), (seed, route.route)
            narrowest = everything.narrowest(route.route, limits)
            if narrowest is None:
                assert route.status != "feasible", where
                continue
            found += 1
            assert route.plan is not None, where
            assert route.plan.precision is not None
            assert isclose(route.plan.precision.half_width, narrowest[0], rel_tol=1e-7), where
            assert route.plan.buy.bill.total <= limits["budget"], where
            assert route.plan.narrowest is not None
            assert isclose(route.plan.narrowest, narrowest[0], rel_tol=1e-6), where
    assert found > 3


# --------------------------------------------------------------------------- what was really asked

WANTED = {
    "conditioning, two covariates or more": 30,
    "an instrument with a covariate": 45,
    "a mechanism with a covariate": 35,
    "somebody pays who validity does not need": 50,
    "the tolerance of bias changes the answer": 20,
    "a worse way is chosen though a better one is there": 75,
    "the floor of the first stage decides on the records": 8,
    "a limit changes the answer": 35,
    "the cheapest set per record is not the cheapest study": 70,
    "sized by half_width": 25,
    "sized by an effect": 22,
    "sized by the implied effect": 22,
    "records given": 20,
    "a design effect": 55,
    "natural units": 15,
    "selection": 8,
    "out of reach": 2,
}
"""What has to matter, with the number of studies in which it has to, of the 200."""


def test_the_200_studies_ask_for_everything(capsys: pytest.CaptureFixture[str]) -> None:
    """A comparison on studies that any search would get right would prove nothing."""
    counts: Counter[str] = Counter()
    for seed in SEEDS:
        study = sized_study(seed)
        size, fieldwork = study["size"], study["fieldwork"]
        found = {what for route in ROUTES for what in asked(seed, route)}
        kinds = {
            "sized by half_width": "half_width" in size,
            "sized by an effect": isinstance(size.get("detect"), float),
            "sized by the implied effect": size.get("detect") == "implied",
            "records given": "records" in size,
            "a design effect": bool({"design_effect", "clusters"} & fieldwork.keys()),
            "natural units": "in" in size,
            "selection": "selected_by" in study,
        }
        is_answered = any(within(seed, route) for route in ROUTES)
        found |= {what for what, is_so in kinds.items() if is_so and is_answered}
        counts.update(found)
    with capsys.disabled():
        print()
        for what in WANTED:
            print(f"    {counts[what]} of {len(SEEDS)} sized studies: {what}")
    assert {what for what, least in WANTED.items() if counts[what] < least} == set(), counts


def asked(seed: int, route: str) -> set[str]:
    """What mattered on one route of a study."""
    everything, best = enumerated(seed), within(seed, route)
    limits = everything.limits(route)
    if best is None:
        is_open = bool(everything.drafts(route).roles)
        return {"out of reach"} if is_open and everything.best(route, {}) is None else set()
    roles, found = best.roles, set()
    if route == "conditioning" and len(roles.covariates) > 1:
        found.add("conditioning, two covariates or more")
    if route == "instrument" and roles.covariates:
        found.add("an instrument with a covariate")
    if route == "mechanism" and roles.covariates:
        found.add("a mechanism with a covariate")
    if any(fewer(everything, route, best, name) for name in roles.names):
        found.add("somebody pays who validity does not need")
    reads = everything.errors
    if any(reads[n][everything.ranked[n].index(w)] > reads[n][0] for n, w in best.measure.items()):
        found.add("a worse way is chosen though a better one is there")
    changed = {limit for limit, study in without(seed, route).items() if study.key != best.key}
    if changed:
        found.add("a limit changes the answer")
    if "bias" in changed:
        found.add("the tolerance of bias changes the answer")
    is_sized = "records" not in limits
    if is_sized and everything.records_by_precision(best) < best.records:
        found.add("the floor of the first stage decides on the records")
    if is_sized and cheapest_per_record(everything, route) != best.measure:
        found.add("the cheapest set per record is not the cheapest study")
    return found


def fewer(everything: SizedEnumeration, route: str, best: Study, name: str) -> bool:
    """Whether the roles stay valid without somebody."""
    criteria, roles = everything.criteria, best.roles
    some = set(roles.covariates) - {name}
    if name in roles.instrument:
        return False
    if route == "conditioning":
        return criteria.conditioning(some)
    if route == "instrument":
        return criteria.instrument(roles.instrument[0], some)
    return criteria.mechanism(set(roles.mediators) - {name}, some)


def cheapest_per_record(everything: SizedEnumeration, route: str) -> dict[str, str]:
    """Who is measured, and how, if all studies were of 1,000 records."""
    drafts = everything.drafts(route)
    totals, _ = everything.roughly(drafts.bought, 1000 + 0 * drafts.core.clip(0, 1))
    return everything.exactly(drafts, int(totals.argmin()), 1000).measure

"""Laws that every answer keeps, whatever the study."""

from collections.abc import Callable
from copy import deepcopy
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

from planner import read_study, recommend
from tests.random_studies import random_study, sized_study, text_of

SEEDS = range(1000, 1040)
SIZED_SEEDS = range(700, 706)


def totals(study: dict[str, Any], write: Callable[..., Path]) -> dict[str, Fraction | None]:
    """What each route costs; None where there is no plan."""
    answer = recommend(read_study(write(text_of(study))))
    return {
        each.route: each.plan.buy.bill.total if each.plan else None
        for each in answer.effects[0].routes
    }


def never_less(dear: dict[str, Fraction | None], cheap: dict[str, Fraction | None]) -> bool:
    """Whether no route is cheaper in the first answer than in the second."""
    return all(
        dear[route] is None or (total is not None and dear[route] >= total)
        for route, total in cheap.items()
    )


@pytest.mark.parametrize("part", ["per_unit", "setup"])
def test_a_dearer_price_never_makes_a_cheaper_plan(part: str, write: Callable[..., Path]) -> None:
    changed = 0
    for seed in SEEDS:
        study = random_study(seed)
        before = totals(study, write)
        for entry in (*study["components"].values(), study["variables"]["x"]["ways"]["w0"]):
            dearer = deepcopy(study)
            target = find(dearer, study, entry)
            target[part] = float(Fraction(str(target.get(part, 0))) + 3)
            after = totals(dearer, write)
            assert never_less(after, before), (seed, part)
            changed += after != before
    assert changed > 12


def find(copy: dict[str, Any], study: dict[str, Any], entry: dict[str, Any]) -> dict[str, Any]:
    """The same entry in a copy of the study."""
    for name, each in study["components"].items():
        if each is entry:
            return copy["components"][name]
    return copy["variables"]["x"]["ways"]["w0"]


def test_one_more_measurable_variable_never_makes_a_dearer_plan(write: Callable[..., Path]) -> None:
    helped = 0
    for seed in SEEDS:
        study = random_study(seed)
        hidden = [name for name, each in study["variables"].items() if "measurable" in each]
        before = totals(study, write)
        for name in hidden:
            more = deepcopy(study)
            del more["variables"][name]["measurable"]
            more["variables"][name]["per_unit"] = 1
            after = totals(more, write)
            assert never_less(before, after), (seed, name)
            helped += after != before
    assert helped > 3


def test_the_same_study_gives_the_same_answer_in_any_order(write: Callable[..., Path]) -> None:
    """The order of the file is no reason to buy something else."""
    for seed in SEEDS:
        study = random_study(seed)
        answer = recommend(read_study(write(text_of(study)))).as_dict()
        turned = deepcopy(study)
        turned["variables"] = dict(reversed(study["variables"].items()))
        other = recommend(read_study(write(text_of(turned)))).as_dict()
        assert bought(answer) == bought(other), seed


def bought(answer: dict[str, Any]) -> list[Any]:
    """What each route buys, and in which roles."""
    (effect,) = answer["effects"]
    return [
        effect["recommended"],
        *(
            (each["plan"]["roles"], each["plan"]["buy"]["measure"])
            for each in effect["routes"]
            if each["plan"]
        ),
    ]


# ------------------------------------------------------------------------- at a stated precision


def test_a_dearer_price_never_makes_a_cheaper_study(write: Callable[..., Path]) -> None:
    changed = 0
    for seed in SIZED_SEEDS:
        study = sized_study(seed)
        before = totals(study, write)
        for entry in (*study["components"].values(), study["variables"]["y"]["ways"]["w0"]):
            dearer = deepcopy(study)
            target = find_in(dearer, study, entry)
            target["per_unit"] = float(Fraction(str(target.get("per_unit", 0))) + 2)
            after = totals(dearer, write)
            assert never_less(after, before), seed
            changed += after != before
    assert changed > 4


def find_in(copy: dict[str, Any], study: dict[str, Any], entry: dict[str, Any]) -> dict[str, Any]:
    """A component or a way of the outcome in a copy of the study."""
    for name, each in study["components"].items():
        if each is entry:
            return copy["components"][name]
    return copy["variables"]["y"]["ways"]["w0"]


def test_a_looser_tolerance_never_makes_a_dearer_study(write: Callable[..., Path]) -> None:
    changed = 0
    for seed in SIZED_SEEDS:
        study = sized_study(seed)
        study.pop("tolerance", None)
        for loose, strict in (
            ({"bias": 0.3}, {"bias": 0.1}),
            ({}, {"bias": 0.3}),
            ({"first_stage_F": 0}, {"first_stage_F": 300}),
        ):
            before = totals(study | {"tolerance": loose}, write)
            after = totals(study | {"tolerance": strict}, write)
            assert never_less(after, before), (seed, strict)
            changed += after != before
    assert changed > 4


def test_one_more_measurable_variable_never_makes_a_dearer_study(
    write: Callable[..., Path],
) -> None:
    helped = 0
    for seed in range(700, 780):
        study = sized_study(seed)
        hidden = [name for name, each in study["variables"].items() if "measurable" in each]
        if not hidden:
            continue
        before = totals(study, write)
        for name in hidden:
            more = deepcopy(study)
            del more["variables"][name]["measurable"]
            more["variables"][name]["per_unit"] = 1
            after = totals(more, write)
            assert never_less(before, after), (seed, name)
            helped += after != before
    assert helped > 3


def test_more_power_is_never_cheaper(write: Callable[..., Path]) -> None:
    changed = 0
    for seed in SIZED_SEEDS:
        study = sized_study(seed)
        before = totals(study | {"size": {"detect": "implied", "power": 0.8}}, write)
        after = totals(study | {"size": {"detect": "implied", "power": 0.9}}, write)
        assert never_less(after, before), seed
        changed += after != before
    assert changed > 1


def test_a_narrower_interval_is_never_cheaper(write: Callable[..., Path]) -> None:
    changed = 0
    for seed in SIZED_SEEDS:
        study = sized_study(seed)
        before = totals(study | {"size": {"half_width": 0.2}}, write)
        after = totals(study | {"size": {"half_width": 0.15}}, write)
        assert never_less(after, before), seed
        changed += after != before
    assert changed > 1


def test_a_shorter_search_brackets_the_optimum(write: Callable[..., Path]) -> None:
    """What is bought in a hurry costs no less than the optimum, and its bound is no higher."""
    cut_short = 0
    for seed in SIZED_SEEDS:
        study = read_study(write(text_of(sized_study(seed))))
        whole = {each.route: each.plan for each in recommend(study).effects[0].routes}
        for seconds in (0.0, 0.02):
            for each in recommend(study, seconds=seconds).effects[0].routes:
                best = whole[each.route]
                if best is None:
                    assert each.plan is None, (seed, each.route)
                elif each.plan is not None:
                    optimum = best.buy.bill.total
                    assert each.plan.buy.lower_bound <= optimum, (seed, each.route)
                    assert each.plan.buy.bill.total >= optimum, (seed, each.route)
                    cut_short += not each.plan.buy.proved
    assert cut_short > 1

"""Laws that every answer keeps, whatever the study."""

from collections.abc import Callable
from copy import deepcopy
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

from planner import read_study, recommend
from tests.random_studies import random_study, text_of

SEEDS = range(1000, 1060)


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
    assert changed > 20


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
    assert helped > 5


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

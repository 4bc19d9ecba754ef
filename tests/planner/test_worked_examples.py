"""Diagrams with known answers, from the literature and from trying all subsets; sources in the file."""

from fractions import Fraction
from itertools import chain, combinations
from typing import Any

import pytest
import yaml

from costs.prices import PriceList, Terms, Way
from planner.claims import Claim, Roles
from planner.diagram import Diagram
from planner.program import Choice, NothingFound, Within
from planner.routes import ROUTES
from planner.search import Deadline, cheapest
from tests.conftest import ROOT

EXAMPLES: list[dict[str, Any]] = yaml.safe_load(
    (ROOT / "tests" / "reference" / "worked_examples.yaml").read_text(encoding="utf-8")
)
every_example = pytest.mark.parametrize("example", EXAMPLES, ids=lambda each: each["id"])


def diagram_of(example: dict[str, Any]) -> Diagram:
    """The diagram of an example."""
    arrows = [arrow.split(" -> ") for arrow in example["arrows"].split(", ")]
    return Diagram.of(
        {name: [tail for tail, head in arrows if head == name] for name in example["nodes"].split()}
    )


def is_valid(example: dict[str, Any], route: str, **roles: list[str]) -> bool:
    """Whether the plain check of a route accepts these roles."""
    diagram = diagram_of(example)
    claim = Claim.of(route, diagram, "t", "y")
    nodes = {role: diagram.nodes(names) for role, names in roles.items()}
    return ROUTES[route].is_valid(claim, Roles(**nodes))


def candidates(example: dict[str, Any]) -> list[str]:
    """What can be measured besides treatment and outcome."""
    return [
        n for n in example["nodes"].split() if n not in {"t", "y", *example["unmeasurable"].split()}
    ]


def subsets(names: list[str]) -> list[list[str]]:
    """Every subset, smaller ones first."""
    sizes = range(len(names) + 1)
    return [
        list(each) for each in chain.from_iterable(combinations(sorted(names), n) for n in sizes)
    ]


@every_example
def test_published_claims_hold(example: dict[str, Any]) -> None:
    for claim in example["published"]:
        match claim["kind"]:
            case "conditioning":
                found = is_valid(example, "conditioning", covariates=claim["set"])
            case "instrument":
                found = is_valid(
                    example,
                    "instrument",
                    instruments=[claim["instrument"]],
                    covariates=claim["given"],
                )
            case "mechanism":
                found = is_valid(
                    example, "mechanism", mediators=claim["mediators"], covariates=claim["given"]
                )
            case "some_adjustment_set":
                sets = subsets(candidates(example))
                found = any(is_valid(example, "conditioning", covariates=each) for each in sets)
            case kind:
                pytest.fail(kind)
        assert found == claim["value"], claim


@every_example
def test_smallest_conditioning_sets_are_the_known_ones(example: dict[str, Any]) -> None:
    valid = [
        set(each)
        for each in subsets(candidates(example))
        if is_valid(example, "conditioning", covariates=each)
    ]
    smallest = [sorted(each) for each in valid if not any(other < each for other in valid)]
    assert sorted(smallest) == sorted(example["minimal_adjustment_sets"])


@every_example
def test_instruments_are_the_known_ones(example: dict[str, Any]) -> None:
    found = []
    for z in candidates(example):
        others = [name for name in candidates(example) if name != z]
        valid = [
            set(each)
            for each in subsets(others)
            if is_valid(example, "instrument", instruments=[z], covariates=each)
        ]
        found += [(z, sorted(w)) for w in valid if not any(other < w for other in valid)]
    assert sorted(found) == sorted(
        (each["instrument"], each["given"]) for each in example["instruments"]
    )


@every_example
def test_known_mechanisms_are_valid(example: dict[str, Any]) -> None:
    for each in example["mechanisms"]:
        assert is_valid(
            example, "mechanism", mediators=each["mediators"], covariates=each["given"]
        ), each


@every_example
def test_the_program_finds_the_known_price(example: dict[str, Any]) -> None:
    prices = {"t": 0, "y": 0} | {
        name: example.get("prices", {}).get(name, 1) for name in candidates(example)
    }
    ways = {name: {"standard": Way(per_unit=Fraction(price))} for name, price in prices.items()}
    within = Within(prices=PriceList(ways=ways, components={}), terms=Terms(records=1))
    for route, known in example["cheapest"].items():
        claim = Claim.of(route, diagram_of(example), "t", "y")
        answer = cheapest([Choice((claim,))], within, deadline=Deadline(60))
        found = None if isinstance(answer, NothingFound) else answer.bill.total
        assert found == known, route
        assert answer.proved


def test_the_file_holds_every_kind_of_case() -> None:
    kinds = {claim["kind"] for example in EXAMPLES for claim in example["published"]}
    assert kinds == {"conditioning", "instrument", "mechanism", "some_adjustment_set"}
    assert all(example["source"] and example["provenance"] for example in EXAMPLES)

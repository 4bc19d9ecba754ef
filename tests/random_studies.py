"""Small random studies, as the plain values that a study file holds."""

import random
from typing import Any

import yaml

NAMES = "abcdefgh"


def random_study(seed: int) -> dict[str, Any]:
    """A small study, with components, ways, yields, batches and limits.

    Seeds take turns in what the diagram is made to ask for: several covariates, an instrument that
    needs some, a mechanism that needs company. Arrows are then added at random.
    """
    rng = random.Random(seed)
    arrows, unmeasurable, hidden = DIAGRAMS[seed % len(DIAGRAMS)](rng)
    if rng.random() < 0.2:
        arrows |= {("x", "g"), ("c", "g")}
    names = sorted({name for arrow in arrows for name in arrow} | {"x", "y"})
    order = topological(names, arrows)
    for tail, head in pairs(order):
        if rng.random() < 0.02 and (tail, head) != ("x", "y"):
            arrows.add((tail, head))
    components = random_components(rng)
    burdens = {"minutes": {"price": price(rng, 2), "limit": rng.choice([6, 9, 12, 30, 30])}}
    variables: dict[str, Any] = {}
    rng.shuffle(names)
    for name in names:
        variables[name] = {"caused_by": [tail for tail, head in sorted(arrows) if head == name]}
        if name in unmeasurable:
            variables[name]["measurable"] = "no"
        else:
            ways = rng.choice([1, 2, 2])
            variables[name]["ways"] = {f"w{i}": random_way(rng, components) for i in range(ways)}
    study: dict[str, Any] = {
        "title": f"Random study {seed}",
        "effect": {"treatment": "x", "outcome": "y"},
        "variables": variables,
        "hidden_common_causes": [list(pair) for pair in hidden],
        "components": components,
        "burdens": burdens,
        "size": {"records": rng.randint(20, 300)},
        "fieldwork": {"usable": rng.choice(["1", "0.9", "0.8"])},
        "overhead": rng.choice(["0", "0.25"]),
        "contingency": rng.choice(["0", "0.05"]),
    }
    if rng.random() < 0.3:
        study["fieldwork"]["frame_size"] = rng.randint(150, 900)
    if rng.random() < 0.3:
        study["budget"] = rng.randint(2000, 12000)
    if rng.random() < 0.3:
        study["tolerance"] = {"least_reliability": "0.6"}
    if rng.random() < 0.1:
        before = [name for name in names if name not in descendants("x", arrows) | {"x", "y"}]
        if before:
            study["selected_by"] = [rng.choice(before)]
    return study


def text_of(study: dict[str, Any]) -> str:
    """The study file."""
    return yaml.safe_dump(study, sort_keys=False)


def price(rng: random.Random, most: float) -> str:
    """A price with two decimals, often a round one."""
    return f"{rng.choice([0, round(rng.uniform(0, most)), rng.uniform(0, most)]):.2f}"


def random_components(rng: random.Random) -> dict[str, Any]:
    """Up to four components; a later one may need an earlier one."""
    components: dict[str, Any] = {}
    if rng.random() < 0.5:
        components["base"] = {
            "always": True,
            "per_unit": price(rng, 3),
            "yields": rng.choice(["1", "0.5"]),
        }
    for name in ("kit", "visit", "link")[: rng.randint(1, 3)]:
        entry: dict[str, Any] = {"setup": rng.randint(0, 900), "per_unit": price(rng, 5)}
        if components and rng.random() < 0.4:
            entry["needs"] = [rng.choice(list(components))]
        if rng.random() < 0.3:
            entry["batch"] = {"holds": rng.randint(5, 40), "price": rng.randint(10, 300)}
        if rng.random() < 0.4:
            entry["yields"] = rng.choice(["0.9", "0.85", "0.7"])
        if rng.random() < 0.3:
            entry["takes"] = {"minutes": rng.choice([1, "1.5", 3])}
        components[name] = entry
    return components


def random_way(rng: random.Random, components: dict[str, Any]) -> dict[str, Any]:
    """A way of measuring, which may need components."""
    way: dict[str, Any] = {
        "per_unit": price(rng, 8),
        "reliability": rng.choice(["1", "0.9", "0.5"]),
    }
    if rng.random() < 0.7:
        way["needs"] = sorted({rng.choice(list(components)) for _ in range(rng.choice([1, 1, 2]))})
    if rng.random() < 0.3:
        way["setup"] = rng.randint(0, 600)
    if rng.random() < 0.2:
        way["batch"] = {"holds": rng.randint(5, 40), "price": rng.randint(10, 300)}
    if rng.random() < 0.25:
        way["yields"] = rng.choice(["0.95", "0.9", "0.8"])
    if rng.random() < 0.4:
        way["takes"] = {"minutes": rng.choice(["0.5", 1, 2, 4])}
    return way


# ----------------------------------------------------------------------------------------- diagrams

Drawing = tuple[set[tuple[str, str]], set[str], list[tuple[str, str]]]
"""Arrows, unmeasurable variables, pairs with a hidden common cause."""


def confounded(rng: random.Random) -> Drawing:
    """Two or three back doors, some of them with two places to close them."""
    arrows = {("x", "y")} if rng.random() < 0.6 else {("x", "f"), ("f", "y")}
    arrows |= {("a", "x"), ("a", "b"), ("b", "y"), ("c", "x"), ("c", "y")}
    arrows |= rng.choice(
        [{("d", "x"), ("d", "e"), ("e", "y")}, {("d", "b"), ("d", "x"), ("e", "x")}]
    )
    return arrows, {"d"} if rng.random() < 0.5 else {"e"}, []


def instrumental(rng: random.Random) -> Drawing:
    """Candidates for an instrument that share causes with the outcome; treatment and outcome hidden."""
    arrows = {("x", "y"), ("a", "x"), ("b", "a"), ("b", "y")}
    arrows |= rng.choice(
        [{("c", "x"), ("d", "c"), ("d", "y")}, {("c", "a"), ("c", "e"), ("e", "y")}]
    )
    arrows |= rng.choice([{("d", "b"), ("d", "x")}, {("e", "x"), ("e", "b")}, set()])
    return arrows, set(), [("x", "y")]


def mediated(rng: random.Random) -> Drawing:
    """Mediators with causes of their own; treatment and outcome hidden."""
    arrows = {("x", "a"), ("a", "y"), ("b", "a"), ("b", "y")}
    arrows |= rng.choice(
        [
            {("x", "c"), ("c", "y")},
            {("a", "c"), ("c", "y"), ("d", "c"), ("d", "x")},
            {("d", "x"), ("d", "a")},
        ]
    )
    arrows |= rng.choice([{("e", "x"), ("e", "y")}, {("f", "e"), ("e", "b"), ("f", "x")}, set()])
    return arrows, set(), [("x", "y")]


def anything(rng: random.Random) -> Drawing:
    """Arrows at random, two variables unmeasurable."""
    names = [*NAMES[: rng.randint(4, 6)], "x", "y"]
    rng.shuffle(names)
    arrows = {pair for pair in pairs(names) if rng.random() < 0.3}
    if names.index("x") < names.index("y"):
        arrows |= rng.choice([{("x", "y")}, set()])
    return arrows, set(rng.sample(sorted(set(names) - {"x", "y"}), 2)), []


DIAGRAMS = (confounded, instrumental, mediated, anything)


def pairs(order: list[str]) -> list[tuple[str, str]]:
    """Every pair, in this order."""
    return [(one, other) for i, one in enumerate(order) for other in order[i + 1 :]]


def topological(names: list[str], arrows: set[tuple[str, str]]) -> list[str]:
    """The names, causes first."""
    order: list[str] = []
    while len(order) < len(names):
        order += [
            name
            for name in names
            if name not in order and all(t in order for t, h in arrows if h == name)
        ]
    return order


def descendants(start: str, arrows: set[tuple[str, str]]) -> set[str]:
    """What follows from a variable, itself included."""
    found = {start}
    while more := {head for tail, head in arrows if tail in found} - found:
        found |= more
    return found

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


def sized_study(seed: int) -> dict[str, Any]:
    """A small study at a stated precision: strengths on all arrows, two ways of most variables.

    Seeds take turns in the diagrams, to which causes of the outcome alone are added, and in what
    sizes the study.
    """
    rng = random.Random(f"sized {seed}")
    arrows, unmeasurable, hidden = SIZED_DIAGRAMS[seed % len(SIZED_DIAGRAMS)](rng)
    unmeasurable = rng.choice([unmeasurable, set()])
    for name in ("p", "q")[: rng.choice([0, 1, 1, 2])]:
        arrows.add((name, "y"))
        if rng.random() < 0.4:
            arrows.add((name, rng.choice(["a", "b", "x"])))
    if rng.random() < 0.1:
        arrows |= {("x", "g"), (rng.choice(["y", "c"]), "g")}
    if "x" not in descendants("y", arrows) and "y" not in descendants("x", arrows):
        arrows.add(("x", "y"))
    names = sorted({name for arrow in arrows for name in arrow} | {"x", "y"})
    order = topological(names, arrows)
    strengths, of_hidden, effect = random_strengths(rng, order, arrows, hidden)
    components = random_components(rng)
    if "base" in components:
        components["base"]["per_unit"] = f"{rng.uniform(2, 25):.2f}"
    variables: dict[str, Any] = {}
    rng.shuffle(names)
    for name in names:
        variables[name] = {"caused_by": strengths[name]}
        if name in unmeasurable:
            variables[name]["measurable"] = "no"
        else:
            ways = 2 if rng.random() < 0.85 else 1
            variables[name]["ways"] = sized_ways(rng, components, ways)
    study: dict[str, Any] = {
        "title": f"Sized study {seed}",
        "effect": {"treatment": "x", "outcome": "y"},
        "variables": variables,
        "hidden_common_causes": of_hidden,
        "components": components,
        "burdens": {"minutes": {"price": price(rng, 1), "limit": rng.choice([9, 12, 30, 30])}},
        "size": random_size(rng, seed // len(SIZED_DIAGRAMS) % 4, effect),
        "fieldwork": {"usable": rng.choice(["1", "0.9", "0.8"])},
        "overhead": rng.choice(["0", "0", "0.25"]),
    }
    add_terms(rng, study)
    before = [n for n in names if n not in descendants("x", arrows) | {"x", "y"}]
    if rng.random() < 0.1 and before:
        study["selected_by"] = [rng.choice(before)]
    return study


def hard_study(seed: int) -> dict[str, Any]:
    """A sized study that is hard on bounds: candidates nearly alike, poor readings, suppression."""
    study = sized_study(seed)
    rng = random.Random(f"hard {seed}")
    variables = study["variables"]
    arrows = {(c, name) for name, each in variables.items() for c in each["caused_by"]}
    order = topological(sorted(variables), arrows)
    late = descendants("x", arrows)
    for tail, head in pairs(order):
        if rng.random() < 0.25 and head not in late:
            arrows.add((tail, head))
    hidden = [each["of"] for each in study["hidden_common_causes"]]
    most, largest = rng.choice([(0.98, 1.5), (0.9, 1.0), (0.97, 0.6)])
    strengths, study["hidden_common_causes"], _ = random_strengths(
        rng, topological(order, arrows), arrows, hidden, most, largest
    )
    for name, each in variables.items():
        each["caused_by"] = strengths[name]
        for way in each.get("ways", {}).values():
            way["reliability"] = rng.choice(["1", "0.97", "0.8", "0.5", "0.2"])
    if "detect" in study["size"]:
        study["size"]["detect"] = "implied"
    return study


def add_terms(rng: random.Random, study: dict[str, Any]) -> None:
    """Limits, tolerances, clusters and natural units, each in some of the studies."""
    if rng.random() < 0.15:
        study["variables"]["x"]["sd"] = rng.choice([0.5, 2.0])
        study["variables"]["y"]["share"] = 0.2
        study["size"]["in"] = "units"
        for key in ("half_width", "detect"):
            if isinstance(study["size"].get(key), float):
                ratio = 0.4 / study["variables"]["x"]["sd"]
                study["size"][key] = round(study["size"][key] * ratio, 4)
    effect = rng.choice([None, None, 1.3, {"conditioning": 1.5, "instrument": 1.2}, "clusters"])
    if effect == "clusters":
        study["fieldwork"]["clusters"] = {"holds": 20, "icc": {"treatment": 0.3, "outcome": 0.05}}
    elif effect is not None:
        study["fieldwork"]["design_effect"] = effect
    if rng.random() < 0.3:
        study["fieldwork"]["frame_size"] = round(10 ** rng.uniform(2.5, 4))
    if rng.random() < 0.3:
        study["budget"] = round(10 ** rng.uniform(3.5, 5))
    tolerance: dict[str, Any] = {}
    if rng.random() < 0.7:
        tolerance["bias"] = rng.choice([0.1, 0.2, 0.3, 0.4, 0.6])
    floor = rng.choice([None, None, 0, 5, 20, 150, 500])
    if floor is not None:
        tolerance["first_stage_F"] = floor
    if rng.random() < 0.15:
        tolerance["least_reliability"] = "0.6"
    if tolerance:
        study["tolerance"] = tolerance


def random_size(rng: random.Random, kind: int, effect: float) -> dict[str, Any]:
    """What sizes a study."""
    if kind == 0:
        return {"half_width": round(rng.uniform(0.04, 0.2), 3)}
    if kind == 1:
        power = rng.choice([0.8, 0.9])
        return {"detect": round(max(abs(effect), 0.05) * rng.uniform(0.5, 1), 3), "power": power}
    if kind == 2:
        return {"detect": "implied", "confidence": rng.choice([0.95, 0.95, 0.9])}
    return {"records": round(10 ** rng.uniform(0.7, 3.2))}


def random_strengths(
    rng: random.Random,
    order: list[str],
    arrows: set[tuple[str, str]],
    hidden: list[Any],
    most: float = 0.85,
    largest: float = 0.7,
) -> tuple[dict[str, dict[str, float]], list[dict[str, Any]], float]:
    """Strengths, of hidden common causes too, and the effect that they imply.

    Every variable is explained to ``most`` at most. Drawn again until the effect is none of the
    smallest.
    """
    while True:
        of_hidden = [
            {"of": list(pair), "strength": rng.choice([-0.2, 0.1, 0.3])} for pair in hidden
        ]
        known: dict[tuple[str, str], float] = {}
        strengths: dict[str, dict[str, float]] = {}
        added = {"x": 1.0}
        for name in order:
            causes = sorted(tail for tail, head in arrows if head == name)
            into = {c: rng.choice([-1, 1, 1]) * rng.uniform(0.15, largest) for c in causes}
            loads = {}
            for number, each in enumerate(of_hidden):
                if name in each["of"]:
                    root = abs(each["strength"]) ** 0.5
                    is_turned = each["strength"] < 0 and name == each["of"][1]
                    loads[f"hidden {number}"] = -root if is_turned else root
            while explained(known, into | loads) > most:
                into = {c: 0.93 * b for c, b in into.items()}
            strengths[name] = {c: round(b, 3) for c, b in into.items()}
            every = strengths[name] | loads
            for other in {one for pair in known for one in pair} | every.keys():
                both = sum(b * between(known, c, other) for c, b in every.items())
                known[name, other] = known[other, name] = both
            known[name, name] = 1.0
            if name != "x":
                added[name] = sum(b * added.get(c, 0) for c, b in strengths[name].items())
        if abs(added.get("y", 0.0)) > 0.05 or "y" not in descendants("x", arrows):
            return strengths, of_hidden, added["y"]


def between(known: dict[tuple[str, str], float], one: str, other: str) -> float:
    """A covariance; hidden causes have none with what has not been met."""
    return 1.0 if one == other else known.get((one, other), 0.0)


def explained(known: dict[tuple[str, str], float], into: dict[str, float]) -> float:
    """The share of a variable that its causes explain."""
    return sum(b * c * between(known, p, q) for p, b in into.items() for q, c in into.items())


def sized_ways(rng: random.Random, components: dict[str, Any], count: int) -> dict[str, Any]:
    """Ways of measuring one variable; a better reading is mostly the dearer one."""
    ways = [random_way(rng, components) for _ in range(count)]
    for way in ways:
        way["reliability"] = rng.choice(["1", "0.95", "0.9", "0.8", "0.6", "0.35"])
    if rng.random() < 0.7:
        reads = sorted((way["reliability"] for way in ways), key=float)
        ways.sort(key=lambda way: float(way["per_unit"]))
        for way, read in zip(ways, reads, strict=True):
            way["reliability"] = read
        rng.shuffle(ways)
    return {f"w{number}": way for number, way in enumerate(ways)}


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


def all_routes(rng: random.Random) -> Drawing:
    """Two confounders, candidates for an instrument, one or two mediators."""
    arrows = {("a", "x"), ("a", "y"), ("b", "x"), ("b", "y"), ("d", "x"), ("x", "m"), ("m", "y")}
    if rng.random() < 0.5:
        arrows |= {("e", "d"), ("e", "y")}
    if rng.random() < 0.4:
        arrows |= {("x", "n"), ("n", "y")} | rng.choice([set(), {("m", "n")}])
    if rng.random() < 0.4:
        arrows |= {("c", "m"), ("c", rng.choice(["x", "y"]))}
    if rng.random() < 0.4:
        arrows |= {("a", "b")}
    return arrows, {"b"} if rng.random() < 0.2 else set(), []


SIZED_DIAGRAMS = (
    confounded,
    all_routes,
    instrumental,
    mediated,
    all_routes,
    mediated,
    all_routes,
    anything,
)


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

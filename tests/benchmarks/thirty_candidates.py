"""Twenty seeded studies with 30 candidate covariates, two ways of measuring each: how fast, how sure.

    python tests/benchmarks/thirty_candidates.py [--seconds 60] [--seeds 1 2 3] [--route instrument]

Each study has confounders (some of them to be closed at either of two places), causes of the outcome
that only steady the estimate, causes of the treatment, two instruments, readings of things nobody
needs, a mediator with two ways, components with set-up prices, losses, a limit of minutes; two in
three tolerate a bias of 40 %, the others any. All of it is invented. A line a study and route: the
seconds until the proof, or the gap when the time was over.
"""

import argparse
import random
import statistics
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import yaml

from planner import read_study
from planner.claims import Claim
from planner.deadline import Deadline
from planner.limits import demand_of, within_limits
from planner.linear import diagram_of
from planner.program import Choice
from planner.search import Answer, cheapest

SEEDS = tuple(range(1, 21))
ROUTES = ("conditioning", "instrument", "mechanism")
SOON = 20
"""Seconds in which half of the studies are to be proved."""


Arrows = dict[str, dict[str, float]]


class Drawing:
    """A diagram in the making: arrows with strengths, and candidates not yet given a part."""

    def __init__(self, rng: random.Random) -> None:
        self.rng = rng
        self.names = [f"c{number:02d}" for number in range(30)]
        self.arrows: Arrows = {name: {} for name in self.names}
        pool = self.names.copy()
        rng.shuffle(pool)
        self.pool = pool

    def take(self, count: int = 1) -> list[str]:
        """Return some candidates that have no part yet."""
        taken, self.pool = self.pool[:count], self.pool[count:]
        return taken

    def arrow(self, tail: str, head: str, low: float = 0.08, high: float = 0.25) -> None:
        """Draw an arrow."""
        self.arrows.setdefault(tail, {})
        self.arrows.setdefault(head, {})[tail] = strength(self.rng, low, high)

    def confounders(self) -> None:
        """Four plain ones, three pairs, two behind something unmeasurable, one that is everywhere."""
        for name in self.take(4):
            self.arrow(name, "x")
            self.arrow(name, "y")
        for _ in range(3):
            one, other = self.take(2)
            self.arrow(one, "x")
            self.arrow(one, other, 0.3, 0.6)
            self.arrow(other, "y")
        for name in self.take(2):
            self.arrow(f"u{name}", "x")
            self.arrow(f"u{name}", name, 0.4, 0.7)
            self.arrow(name, "y")
        (name,) = self.take()
        for head in ("x", "m", "y"):
            self.arrow(name, head)

    def instruments(self) -> None:
        """Two plain ones, and one that needs a covariate."""
        for name in self.take(2):
            self.arrow(name, "x", 0.2, 0.4)
        company, name = self.take(2)
        self.arrow(company, name, 0.2, 0.4)
        self.arrow(company, "y")
        self.arrow(name, "x", 0.15, 0.3)

    def others(self) -> None:
        """Seven causes of the outcome; the rest are readings of these and of a cause of x."""
        steady = self.take(7)
        for name in steady:
            self.arrow(name, "y", 0.1, 0.3)
        self.arrow("u_of_x", "x", 0.1, 0.2)
        for name in self.take(len(self.pool)):
            for other in self.rng.sample([*steady, "u_of_x"], 2):
                self.arrow(other, name, 0.2, 0.5)


def thirty_candidates(seed: int) -> dict[str, Any]:
    """A study with 30 candidate covariates, as the plain values of a study file."""
    rng = random.Random(seed)
    drawing = Drawing(rng)
    drawing.arrow("x", "m", 0.35, 0.6)
    drawing.arrow("m", "y", 0.3, 0.5)
    drawing.confounders()
    drawing.instruments()
    drawing.others()
    arrows = drawing.arrows
    shrink(arrows)
    components = {
        "base": {
            "always": True,
            "setup": rng.randint(4, 12) * 1000,
            "per_unit": rng.randint(8, 30),
            "yields": rng.choice(["1", "0.8"]),
        },
        "register": {"setup": rng.randint(1, 4) * 1000, "per_unit": "0.30", "needs": ["base"]},
        "visit": {
            "setup": rng.randint(0, 2) * 1000,
            "per_unit": rng.randint(5, 20),
            "yields": "0.9",
        },
        "plate": {"batch": {"holds": 38, "price": rng.randint(2, 8) * 100}, "needs": ["visit"]},
    }
    variables: dict[str, Any] = {}
    for name, causes in arrows.items():
        variables[name] = {"caused_by": {cause: round(b, 4) for cause, b in causes.items()}}
        if name.startswith("u"):
            variables[name]["measurable"] = "no"
        else:
            variables[name]["ways"] = {"good": good_way(rng), "poor": poor_way(rng)}
    return {
        "title": f"Thirty candidates, seed {seed}",
        "effect": {"treatment": "x", "outcome": "y"},
        "variables": variables,
        "components": components,
        "burdens": {"minutes": {"price": "0.75", "limit": 40}},
        "size": {"detect": "implied", "power": "0.8"},
        "fieldwork": {"usable": "0.9"},
        "tolerance": {} if seed % 3 == 0 else {"bias": "0.4"},
    }


def strength(rng: random.Random, low: float, high: float) -> float:
    """A strength of either sign, positive ones more often."""
    return rng.uniform(low, high) * rng.choice([1, 1, -1])


def shrink(arrows: Arrows) -> None:
    """Scale the arrows into a variable down where their squares leave little noise."""
    for causes in arrows.values():
        total = sum(b * b for b in causes.values())
        if total > 0.6:
            for cause in causes:
                causes[cause] *= (0.6 / total) ** 0.5


def good_way(rng: random.Random) -> dict[str, Any]:
    """A dear way."""
    way: dict[str, Any] = {"reliability": f"{rng.uniform(0.88, 1):.2f}"}
    if rng.random() < 0.5:
        way["needs"] = [rng.choice(["register", "visit", "plate"])]
    way["per_unit"] = f"{rng.uniform(0, 4):.2f}"
    if rng.random() < 0.4:
        way["setup"] = rng.randint(1, 12) * 100
    if rng.random() < 0.2:
        way["yields"] = "0.95"
    return way


def poor_way(rng: random.Random) -> dict[str, Any]:
    """A cheap way: a few questions."""
    return {
        "reliability": f"{rng.uniform(0.55, 0.85):.2f}",
        "per_unit": 0,
        "takes": {"minutes": f"{rng.uniform(0.3, 2.5):.1f}"},
    }


@dataclass(frozen=True)
class Run:
    """One search."""

    seed: int
    route: str
    seconds: float
    gap: float
    """Share of the total that might still be saved; 1 where no study was found."""
    total: float


def run(seed: int, route: str, seconds: float) -> Run:
    """Search one study by one route."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "study.yaml"
        path.write_text(yaml.safe_dump(thirty_candidates(seed), sort_keys=False), encoding="utf-8")
        study = read_study(path)
    (effect,) = study.effects
    claim = Claim.of(route, diagram_of(study), effect.treatment, effect.outcome)
    within = within_limits(study, demand=demand_of(study, effect), route=route)
    start = time.perf_counter()
    answer = cheapest([Choice((claim,))], within, Deadline(seconds))
    took = time.perf_counter() - start
    if not isinstance(answer, Answer):
        return Run(seed, route, took, 1 - answer.proved, float("nan"))
    gap = float(1 - answer.lower_bound / answer.bill.total)
    return Run(seed, route, took, gap, float(answer.bill.total))


def yardstick() -> float:
    """Seconds for 20,000 inverses of a matrix of 30 rows: what a bound is made of."""
    matrix = np.eye(30) + 0.1
    start = time.perf_counter()
    for _ in range(20_000):
        np.linalg.inv(matrix)
    return time.perf_counter() - start


def main() -> None:
    """Print a line for each study and route, and a summary for each route."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--seconds", type=float, default=60)
    parser.add_argument("--seeds", type=int, nargs="*", default=SEEDS)
    parser.add_argument("--route", nargs="*", default=ROUTES)
    given = parser.parse_args()
    fixed = yardstick()
    print(f"yardstick, 20,000 inverses of 30 rows: {fixed:.2f} s")
    print(f"{'seed':>4} {'route':<13} {'seconds':>8} {'ratio':>6} {'gap %':>6} {'total':>12}")
    runs = []
    for seed in given.seeds:
        for route in given.route:
            each = run(seed, route, given.seconds)
            runs.append(each)
            print(
                f"{seed:>4} {route:<13} {each.seconds:>8.1f} {each.seconds / fixed:>6.1f}"
                f" {100 * each.gap:>6.2f} {each.total:>12,.2f}",
                flush=True,
            )
    for route in given.route:
        own = [each for each in runs if each.route == route]
        proved = sum(each.gap == 0 and each.seconds <= SOON for each in own)
        middle = statistics.median(each.seconds for each in own)
        print(
            f"{route}: {proved} of {len(own)} proved in {SOON} s, median {middle:.1f} s"
            f" (ratio {middle / fixed:.1f}), largest gap {100 * max(e.gap for e in own):.2f} %"
        )


if __name__ == "__main__":
    main()

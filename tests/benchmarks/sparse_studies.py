"""Seconds for random sparse studies of 30, 100 and 300 variables, as a ratio to a fixed yardstick.

    python tests/benchmarks/sparse_studies.py [--sizes 30 100 300] [--seeds 5]

The yardstick is the bare import of the solver in a fresh process, measured in the same run: it
grows and shrinks with the machine, so that ratios can be compared between machines. All three
routes are searched in each study; half of the studies have a hidden common cause of treatment and
outcome.
"""

import argparse
import random
import statistics
import subprocess
import sys
import time
from fractions import Fraction

from costs.prices import Component, PriceList, Terms, Way
from planner.plan import RouteAnswer
from planner.planning import recommend
from planner.study import Effect, HiddenCause, Size, Study, Variable


def sparse_study(size: int, seed: int) -> Study:
    """A random diagram of average degree 3, 30 % unmeasurable, prices 1 to 20."""
    rng = random.Random(seed)
    names = [f"v{i}" for i in range(size)]
    causes: dict[str, set[str]] = {name: set() for name in names}
    for _ in range(3 * size // 2):
        tail, head = sorted(rng.sample(range(size), 2))
        causes[names[head]].add(names[tail])
    order = range(size)
    after = {names[size // 2]}
    for i in order:
        if causes[names[i]] & after:
            after.add(names[i])
    x = names[size // 2]
    y = max(after, key=lambda name: (len(name), name)) if len(after) > 1 else names[-1]
    if y == x or y not in after:
        y = names[-1]
        causes[y].add(x)
    ways = {
        name: {"standard": Way(per_unit=Fraction(rng.randint(1, 20)))}
        for name in names
        if name in (x, y) or rng.random() > 0.3
    }
    return Study(
        title=f"Random study {seed} of {size} variables",
        unit="unit",
        currency="",
        effects=(Effect(treatment=x, outcome=y),),
        variables={n: Variable(name=n, causes=dict.fromkeys(sorted(causes[n]))) for n in names},
        hidden_causes=(HiddenCause(of=(x, y), name="u"),) if seed % 2 else (),
        prices=PriceList(ways=ways, components={}),
        size=Size(records=100),
        terms=Terms(records=100),
        routes=("conditioning", "instrument", "mechanism"),
    )


def lossy_study(chains: int, seed: int) -> Study:
    """Chains x ← a → b → y, closed at a or at b by either of two lossy ways."""
    rng = random.Random(seed)

    def way() -> Way:
        price = Fraction(rng.randint(20, 500), 100)
        return Way(per_unit=price, yields=Fraction(rng.randint(850, 999), 1000))

    names = [(f"a{i}", f"b{i}") for i in range(chains)]
    causes: dict[str, list[str]] = {"x": [a for a, _ in names], "y": ["x", *(b for _, b in names)]}
    causes |= {a: [] for a, _ in names} | {b: [a] for a, b in names}
    ways = {name: {"p": way(), "q": way()} for name in causes if name not in ("x", "y")}
    ways |= {name: {"standard": Way(per_unit=Fraction(1))} for name in ("x", "y")}
    base = Component(
        always=True, setup=Fraction(5000), per_unit=Fraction(20), yields=Fraction("0.4")
    )
    return Study(
        title=f"Random lossy study {seed} of {chains} chains",
        unit="unit",
        currency="",
        effects=(Effect(treatment="x", outcome="y"),),
        variables={n: Variable(name=n, causes=dict.fromkeys(c)) for n, c in causes.items()},
        prices=PriceList(ways=ways, components={"base": base}),
        size=Size(records=400),
        terms=Terms(records=400),
        routes=("conditioning", "instrument", "mechanism"),
    )


def import_seconds() -> float:
    """The bare import of the solver, in a fresh process; the least of five."""
    command = [sys.executable, "-c", "from ortools.sat.python import cp_model"]
    times = []
    for _ in range(5):
        start = time.perf_counter()
        subprocess.run(command, check=True)
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> None:
    """Print a line for each size."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--sizes", type=int, nargs="*", default=[30, 100, 300])
    parser.add_argument("--chains", type=int, nargs="*", default=[3, 6, 9])
    parser.add_argument("--seeds", type=int, default=6)
    given = parser.parse_args()
    yardstick = import_seconds()
    recommend(sparse_study(10, 0))  # the first call imports the solver
    print(f"bare import of the solver: {yardstick:.2f} s")
    print(f"{'study':<16} {'median s':>9} {'slowest s':>9} {'ratio':>6}  statuses of the routes")
    for kind, make, sizes in (
        ("variables", sparse_study, given.sizes),
        ("lossy chains", lossy_study, given.chains),
    ):
        for size in sizes:
            studies = [make(size, seed) for seed in range(given.seeds)]
            print_times(f"{size} {kind}", studies, yardstick)


def print_times(name: str, studies: list[Study], yardstick: float) -> None:
    """Print how long some studies take; a capital U stands for a plan without a proof."""
    times, statuses = [], []
    for study in studies:
        start = time.perf_counter()
        answer = recommend(study)
        times.append(time.perf_counter() - start)
        routes = answer.effects[0].routes
        statuses.append("".join(letter(each) for each in routes))
    middle = statistics.median(times)
    ratio = middle / yardstick
    print(f"{name:<16} {middle:>9.2f} {max(times):>9.2f} {ratio:>6.2f}  {' '.join(statuses)}")


def letter(answer: RouteAnswer) -> str:
    """A status as one letter."""
    return "U" if answer.plan and not answer.plan.buy.proved else answer.status[0]


if __name__ == "__main__":
    main()

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

from costs.prices import PriceList, Terms, Way
from planner.planning import recommend
from planner.study import Effect, HiddenCause, Study, Variable


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
        hidden_causes=(HiddenCause(of=(x, y)),) if seed % 2 else (),
        prices=PriceList(ways=ways, components={}),
        terms=Terms(records=100),
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
    parser.add_argument("--sizes", type=int, nargs="+", default=[30, 100, 300])
    parser.add_argument("--seeds", type=int, default=6)
    given = parser.parse_args()
    yardstick = import_seconds()
    recommend(sparse_study(10, 0))  # the first call imports the solver
    print(f"bare import of the solver: {yardstick:.2f} s")
    print(f"{'variables':>9} {'median s':>9} {'slowest s':>9} {'ratio':>6}  statuses of the routes")
    for size in given.sizes:
        times, statuses = [], []
        for seed in range(given.seeds):
            study = sparse_study(size, seed)
            start = time.perf_counter()
            answer = recommend(study)
            times.append(time.perf_counter() - start)
            statuses.append("".join(each.status[0] for each in answer.effects[0].routes))
        middle = statistics.median(times)
        ratio = middle / yardstick
        print(f"{size:>9} {middle:>9.2f} {max(times):>9.2f} {ratio:>6.2f}  {' '.join(statuses)}")


if __name__ == "__main__":
    main()

"""No bound of the joint search is above what a study below it comes to, at any node.

The tree is walked without a best study so far, so that nothing is cut off; what lies below each
node is known from ``sized_enumeration``. Beside ordinary studies there are those that are made to
break bounds: candidates nearly alike, readings of reliability 0.2, paths that cancel.
"""

import random
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from math import inf
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from planner import read_study
from planner.bounds import Floor
from planner.claims import Claim
from planner.deadline import Deadline
from planner.joint.branch import Branching, Node, Search
from planner.joint.space import Draft, Space
from planner.joint.till import Till
from planner.limits import demand_of, within_limits
from planner.linear import diagram_of
from planner.study import Study
from tests.enumeration import ROUTES
from tests.random_studies import hard_study, sized_study, text_of
from tests.sized_enumeration import Drafts, SizedEnumeration

ROUNDING = 1e-7
"""Numbers from nearly singular matrices agree to so much of themselves."""
MOST_DRAFTS = 9_000
SEEDS = (*range(3000, 3054), 3067, 3077, 3164, 3165, 3208, 3229)
"""The last ones have broken bounds: of single readings, of what cannot be kept, of rounding up."""
CHUNK = 20
NODES = 160
"""Looked at of each route of a study; of a larger tree every so many-th branch is walked."""


class Watching(Search):
    """A search that never finds anything, so that nothing is dropped for being dearer."""

    def __init__(self) -> None:
        super().__init__(Deadline(3600), ties=True)
        self.most = inf

    @property
    def cutoff(self) -> float:
        """As if a study of this score had been found."""
        return self.most

    def offer(self, space: Space, draft: Draft) -> None:
        """Take no study."""


@dataclass
class Below:
    """Everything that could be done on one route, and which of it is below a node."""

    enumeration: SizedEnumeration
    route: str
    drafts: Drafts
    names: list[str]
    state: np.ndarray
    """For each draft and name the rank of its way; −1 where it is not measured."""
    parts: np.ndarray
    """For each draft and name 1 for a covariate, 2 for an instrument, 3 for a mediator."""
    good: np.ndarray
    """Whether a draft keeps all limits."""
    score: np.ndarray
    """Money, or the squared half-width that the money buys; never above the exact one."""

    @classmethod
    def of(cls, enumeration: SizedEnumeration, route: str) -> "Below":
        """Everything on a route."""
        drafts = enumeration.drafts(route)
        names = sorted(enumeration.measurable)
        state = np.full((len(drafts.core), len(names)), -1)
        parts = np.zeros_like(state)
        x, y = enumeration.x, enumeration.y
        for number, roles in enumerate(drafts.roles):
            rows = slice(drafts.first[number], drafts.first[number + 1])
            for at, name in enumerate([x, y, *roles.names]):
                state[rows, names.index(name)] = drafts.ranks[number][:, at]
            for part, of in enumerate((roles.covariates, roles.instrument, roles.mediators), 1):
                parts[rows, [names.index(name) for name in of]] = part
        limits = enumeration.limits(route)
        good, score = enumeration.scores(route, limits)
        return cls(enumeration, route, drafts, names, state, parts, good, score)

    def at(self, branching: Branching, node: Node, among: np.ndarray) -> np.ndarray:
        """The drafts below a node, of those below its parent."""
        claim = branching.space.claim
        column = {claim.diagram.numbers[name]: at for at, name in enumerate(self.names)}
        state, parts, bought = self.state[among], self.parts[among], self.drafts.bought[among]
        fits = np.ones(len(among), dtype=bool)
        part_of = dict.fromkeys(node.roles.covariates, 1)
        part_of |= dict.fromkeys(node.roles.instruments, 2)
        part_of |= dict.fromkeys(node.roles.mediators, 3)
        for each, rank in node.ways:
            fits &= state[:, column[each]] == rank
            fits &= parts[:, column[each]] == part_of.get(each, 0)
        left = {*node.undecided, *node.open_mediators, *(each for each, _ in node.ways)}
        for each, at in column.items():
            if each not in left:
                fits &= state[:, at] == -1
            elif each in node.undecided:
                fits &= parts[:, at] < 2
        rows = [branching.space.till.names.index(name) for name, _ in self.enumeration.purchases]
        place = {row: at for at, row in enumerate(rows)}
        for row in node.opened:
            fits &= bought[:, place[row]]
        for row in node.closed:
            fits &= ~bought[:, place[row]]
        return among[fits]


def spaces_of(study: Study) -> Iterator[Space]:
    """The space of every route that is open."""
    (effect,) = study.effects
    demand = demand_of(study, effect)
    if demand is None:
        return
    for route in study.routes:
        within = within_limits(study, demand=demand, route=route)
        claim = Claim.of(
            route, diagram_of(study), effect.treatment, effect.outcome, study.selected_by
        )
        yield Space.of(claim, within, Till.of(within.prices, within.terms))


def walk(space: Space, below: Below, rng: random.Random, nodes: int = NODES) -> Counter[str]:
    """Check every node of the tree, or of a part of it that is large enough."""
    counts: Counter[str] = Counter()
    branching, search = Branching(space), Watching()
    everything = np.arange(len(below.good))
    if rng.random() < 0.4 and below.good.any():
        search.most = float(np.quantile(below.score[below.good], rng.choice([0.0, 0.2])))
    stack = [(everything, list(branching.roots()))]
    while stack and counts["nodes"] < nodes:
        among, children = stack.pop()
        held = [below.at(branching, child, among) for child in children]
        covered = np.concatenate(held) if held else np.empty(0, int)
        assert len(set(covered)) == len(covered), "no draft is below two children"
        assert set(covered) == set(among), ("a valid draft is lost", lost(below, among, covered))
        for child, drafts in sorted(zip(children, held, strict=True), key=lambda _: rng.random()):
            counts["nodes"] += 1
            counts["drafts"] += len(drafts)
            node = branching.bounded(child, search)
            check_floor(branching, child, below, drafts)
            check_bound(node, search, below, drafts)
            counts["dropped"] += node is None
            counts["dropped with drafts below"] += node is None and len(drafts) > 0
            counts["bounds above nothing"] += node is not None and node.bound > 0
            if node is not None and node.next is not None:
                stack.append((drafts, list(branching.children(node))))
    return counts


def lost(below: Below, among: np.ndarray, covered: np.ndarray) -> Any:
    """A draft below a parent that is below none of its children."""
    return [told(below, at) for at in sorted(set(among) - set(covered))[:1]]


def told(below: Below, at: int) -> Any:
    """One draft, in words."""
    drafts = below.drafts
    number = drafts.who[at]
    ranks = drafts.ranks[number][at - drafts.first[number]]
    return drafts.roles[number], ranks.tolist(), drafts.core[at], drafts.bias[at]


def check_floor(branching: Branching, node: Node, below: Below, drafts: np.ndarray) -> None:
    """Precision, bias and first stage of every draft below are no better than the floor says."""
    if not len(drafts):
        return
    space = branching.space
    floor: Floor = space.route.bounds.floor(branching.sight(node))
    core = below.drafts.core[drafts] / space.design_effect
    bias, strength = below.drafts.bias[drafts], below.drafts.strength[drafts]
    names = space.claim.diagram.names
    columns = [below.names.index(names[each]) for each in node.undecided]
    options = below.state[drafts][:, columns] + 1
    for each in node.forced:
        covariate = below.parts[drafts, below.names.index(names[each])] == 1
        assert covariate.all(), ("forced", names[each], told(below, drafts[~covariate][0]))
    rows = np.arange(len(columns))
    left = floor.least + floor.increments[rows, options].sum(axis=1)
    least = np.maximum(floor.alpha + floor.gamma * left, floor.kappa * np.sqrt(np.maximum(left, 0)))
    if floor.is_dead:
        least = np.full(len(drafts), inf)
    holds("precision", core, least, below, drafts)
    holds("variance", core, np.full(len(core), floor.variance(max(floor.least, 0))), below, drafts)
    if space.demand.bias < inf:
        holds("bias", bias, np.full(len(bias), floor.bias), below, drafts)
        if floor.more_bias is not None:
            more = floor.decided_bias + floor.more_bias[rows, options].sum(axis=1)
            holds("added bias", bias, more, below, drafts)
    if floor.strongest is not None:
        holds("first stage", np.full(len(strength), floor.strongest), strength, below, drafts)


def holds(
    what: str, value: np.ndarray, least: np.ndarray, below: Below, drafts: np.ndarray
) -> None:
    """Say which draft undercuts a bound."""
    wrong = value < least * (1 - ROUNDING) - 1e-9
    if wrong.any():
        at = int(np.flatnonzero(wrong)[0])
        raise AssertionError((what, value[at], least[at], told(below, drafts[at])))


def check_bound(node: Node | None, search: Watching, below: Below, drafts: np.ndarray) -> None:
    """Nothing below costs less than the bound; what is dropped holds nothing of interest."""
    good = drafts[below.good[drafts]]
    best = float(below.score[good].min()) if len(good) else inf
    if node is None:
        assert best >= search.most * (1 - 1e-9), ("dropped", best, search.most)
    elif node.bound > best * (1 + 1e-9) + 1e-9:
        at = good[int(below.score[good].argmin())]
        raise AssertionError(("bound", node.bound, best, node, told(below, at)))


def bounds_hold(values: dict[str, Any], path: Path, rng: random.Random) -> Counter[str]:
    """Check all routes of one study."""
    counts: Counter[str] = Counter()
    study = read_study(path)
    everything = SizedEnumeration(values)
    for space in spaces_of(study):
        route = space.claim.route
        if 0 < len(everything.drafts(route).core) <= MOST_DRAFTS:
            counts[route] += 1
            found = walk(space, Below.of(everything, route), rng)
            counts += found
    return counts


def without_least_reliability(values: dict[str, Any]) -> dict[str, Any]:
    """The study with all its ways, so that ranks are the same in both."""
    values.get("tolerance", {}).pop("least_reliability", None)
    if not values.get("tolerance", True):
        del values["tolerance"]
    return values


def varied(seed: int) -> dict[str, Any]:
    """An ordinary study or a hard one, sized by money in some."""
    values = without_least_reliability((hard_study if seed % 3 else sized_study)(seed))
    rng = random.Random(f"varied {seed}")
    if rng.random() < 0.2:
        values["size"] = {"spend": round(10 ** rng.uniform(3.5, 5))}
        values.pop("budget", None)
    return values


@pytest.mark.parametrize("first", range(0, len(SEEDS), CHUNK))
def test_no_study_is_below_a_bound(first: int, write: Callable[..., Path]) -> None:
    counts: Counter[str] = Counter()
    for seed in SEEDS[first : first + CHUNK]:
        values = varied(seed)
        counts += bounds_hold(values, write(text_of(values)), random.Random(seed))
    assert min(counts[route] for route in ROUTES) > 0, counts
    assert counts["nodes"] > 1200, counts
    assert counts["drafts"] > 20_000, counts
    assert counts["bounds above nothing"] > 800, counts
    assert counts["dropped with drafts below"] > 200, counts

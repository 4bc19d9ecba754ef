"""The answer to a small study by trying everything, apart from the packages: the yardstick.

Works on the plain values of a study file. Separation is networkx's; bills are worked out here in
full; a route is open if any division of what is bought into roles passes its criterion.
"""

from dataclasses import dataclass
from fractions import Fraction
from itertools import chain, combinations, product
from math import ceil, prod
from typing import Any

import networkx as nx

ROUTES = ("conditioning", "instrument", "mechanism")


@dataclass(frozen=True)
class Best:
    """The cheapest purchase for one route."""

    total: Fraction
    count: int
    names: tuple[str, ...]
    ranks: tuple[int, ...]
    measure: dict[str, str]
    started: int

    @property
    def key(self) -> tuple[Fraction, int, tuple[str, ...], tuple[int, ...]]:
        """What decides between two purchases."""
        return self.total, self.count, self.names, self.ranks


def subsets(names: Any) -> Any:
    """Every subset."""
    names = sorted(names)
    return chain.from_iterable(combinations(names, size) for size in range(len(names) + 1))


def graph_of(study: dict[str, Any]) -> nx.DiGraph:
    """The full diagram, hidden common causes as nodes."""
    graph = nx.DiGraph()
    for name, variable in study["variables"].items():
        graph.add_node(name)
        graph.add_edges_from((cause, name) for cause in variable["caused_by"])
    for number, each in enumerate(study.get("hidden_common_causes", [])):
        pair = each["of"] if isinstance(each, dict) else each
        graph.add_edges_from((f"hidden {number}", name) for name in pair)
    return graph


class Criteria:
    """The three criteria of one effect, straight from their definitions."""

    def __init__(self, graph: nx.DiGraph, x: str, y: str, selected: set[str]) -> None:
        self.graph, self.x, self.y, self.selected = graph, x, y, set(selected)
        self.after = nx.descendants(graph, x) | {x}
        up = nx.ancestors(graph, y) | {y}
        self.causal = (self.after - {x}) & up
        self.forbidden = set().union(*(nx.descendants(graph, c) | {c} for c in self.causal)) | {
            x,
            y,
        }
        self.noncausal = graph.copy()
        self.noncausal.remove_edges_from([(x, c) for c in graph.successors(x) if c in up])
        self.without_x = self._without({x})

    def _without(self, tails: set[str]) -> nx.DiGraph:
        graph = self.graph.copy()
        graph.remove_edges_from([edge for edge in self.graph.edges if edge[0] in tails])
        return graph

    def conditioning(self, covariates: set[str]) -> bool:
        """Whether these covariates do."""
        held = covariates | self.selected
        return not held & self.forbidden and nx.is_d_separator(
            self.noncausal, {self.x}, {self.y}, held
        )

    def instrument(self, z: str, covariates: set[str]) -> bool:
        """Whether this instrument does with these covariates."""
        held = covariates | self.selected
        if z in held or ({z} | held) & self.after:
            return False
        return not nx.is_d_separator(self.graph, {z}, {self.x}, held) and nx.is_d_separator(
            self.noncausal, {z}, {self.y}, held
        )

    def mechanism(self, mediators: set[str], covariates: set[str]) -> bool:
        """Whether these mediators do with these covariates."""
        held = covariates | self.selected
        if not mediators or held & (self.after | mediators) or mediators & {self.x, self.y}:
            return False
        around = self.graph.copy()
        around.remove_nodes_from(mediators)
        if nx.has_path(around, self.x, self.y):
            return False
        return nx.is_d_separator(self.without_x, {self.x}, mediators, held) and nx.is_d_separator(
            self._without(mediators), mediators, {self.y}, held | {self.x}
        )

    def opening_sets(self, candidates: set[str]) -> dict[str, list[frozenset[str]]]:
        """For each route, the sets of candidates that can be given roles so that it is open."""
        people = candidates - {self.x, self.y} - self.selected
        open_by: dict[str, list[frozenset[str]]] = {route: [] for route in ROUTES}
        if self.y not in self.after or self.selected & self.after:
            return open_by
        for chosen in map(set, subsets(people)):
            if self.conditioning(chosen):
                open_by["conditioning"].append(frozenset(chosen))
            if any(self.instrument(z, chosen - {z}) for z in chosen):
                open_by["instrument"].append(frozenset(chosen))
            if any(self.mechanism(set(m), chosen - set(m)) for m in subsets(chosen)):
                open_by["mechanism"].append(frozenset(chosen))
        return open_by


class Bills:
    """What purchases cost, worked out in full from the plain values."""

    def __init__(self, study: dict[str, Any]) -> None:
        self.study = study
        self.components = study.get("components", {})
        fieldwork = study.get("fieldwork", {})
        self.usable = Fraction(str(fieldwork.get("usable", 1)))
        self.surcharge = (1 + Fraction(str(study.get("overhead", 0)))) * (
            1 + Fraction(str(study.get("contingency", 0)))
        )

    def ways(self, name: str) -> dict[str, Any]:
        """The ways of a variable."""
        return self.study["variables"][name].get("ways", {})

    def needs(self, entry: dict[str, Any]) -> set[str]:
        """All components below a purchase."""
        found = set(entry.get("needs", []))
        while more := {n for name in found for n in self.components[name].get("needs", [])} - found:
            found |= more
        return found

    def of(self, measure: dict[str, str], limits: dict[str, Any]) -> tuple[Fraction, int] | None:
        """Total and units started, or None where a limit is broken."""
        ways = [self.ways(name)[way] for name, way in measure.items()]
        least = Fraction(str(limits.get("least_reliability", 0)))
        if any(Fraction(str(way.get("reliability", 1))) < least for way in ways):
            return None
        total, started = self.priced(measure, self.study["size"]["records"])
        minutes = self.minutes(measure)
        if started > limits.get("frame_size", started) or total > limits.get("budget", total):
            return None
        return None if minutes > limits.get("minutes", minutes) else (total, started)

    def purchases(self, measure: dict[str, str]) -> list[dict[str, Any]]:
        """The chosen ways, and every component that comes with them."""
        ways = [self.ways(name)[way] for name, way in measure.items()]
        bought = {name for name, entry in self.components.items() if entry.get("always")}
        bought |= {need for name in bought for need in self.needs(self.components[name])}
        bought |= {need for way in ways for need in self.needs(way)}
        return ways + [self.components[name] for name in bought]

    def priced(self, measure: dict[str, str], records: int) -> tuple[Fraction, int]:
        """Total and units started for so many records."""
        purchases = self.purchases(measure)
        kept = self.usable * prod(Fraction(str(p.get("yields", 1))) for p in purchases)
        started = ceil(records / kept)
        return sum(self.line(p, started) for p in purchases) * self.surcharge, started

    def minutes(self, measure: dict[str, str]) -> Fraction:
        """What one unit has to bear."""
        taken = [p.get("takes", {}).get("minutes", 0) for p in self.purchases(measure)]
        return sum((Fraction(str(each)) for each in taken), Fraction(0))

    def line(self, entry: dict[str, Any], started: int) -> Fraction:
        """One purchase for so many units started."""
        reach = prod(Fraction(str(self.components[n].get("yields", 1))) for n in self.needs(entry))
        count = ceil(started * reach)
        line = (
            Fraction(str(entry.get("setup", 0))) + Fraction(str(entry.get("per_unit", 0))) * count
        )
        if "batch" in entry:
            line += Fraction(str(entry["batch"]["price"])) * ceil(
                count / Fraction(entry["batch"]["holds"])
            )
        for burden, taken in entry.get("takes", {}).items():
            line += (
                Fraction(str(self.study["burdens"][burden]["price"])) * Fraction(str(taken)) * count
            )
        return line


def limits_in(study: dict[str, Any]) -> dict[str, Any]:
    """Every limit of a study."""
    limits = {
        "budget": study.get("budget"),
        "frame_size": study.get("fieldwork", {}).get("frame_size"),
        "least_reliability": study.get("tolerance", {}).get("least_reliability"),
        "minutes": study.get("burdens", {}).get("minutes", {}).get("limit"),
    }
    return {name: limit for name, limit in limits.items() if limit is not None}


class Enumeration:
    """All answers to one study."""

    def __init__(self, study: dict[str, Any]) -> None:
        self.study = study
        self.x, self.y = study["effect"]["treatment"], study["effect"]["outcome"]
        self.bills = Bills(study)
        self.measurable = {name for name in study["variables"] if self.bills.ways(name)}
        criteria = Criteria(graph_of(study), self.x, self.y, set(study.get("selected_by", [])))
        self.open_by = criteria.opening_sets(self.measurable)

    def best(self, route: str, limits: dict[str, Any]) -> Best | None:
        """The cheapest purchase that opens a route within limits."""
        found = [
            best
            for opening in self.open_by[route]
            if (best := self.best_measuring(opening, limits)) is not None
        ]
        return min(found, key=lambda best: best.key, default=None)

    def best_measuring(self, variables: frozenset[str], limits: dict[str, Any]) -> Best | None:
        """The cheapest ways of measuring just these variables, treatment and outcome."""
        names = sorted(variables | {self.x, self.y})
        best: Best | None = None
        for ways in product(*(self.ranked(name) for name in names)):
            measure = dict(zip(names, (way for _, way in ways), strict=True))
            bill = self.bills.of(measure, limits)
            if bill is not None:
                ranks = tuple(rank for rank, _ in ways)
                found = Best(bill[0], len(names), tuple(names), ranks, measure, bill[1])
                best = found if best is None or found.key < best.key else best
        return best

    def ranked(self, name: str) -> list[tuple[int, str]]:
        """The ways of a variable with their rank: the better reading, then the smaller name."""
        ways = self.bills.ways(name)
        order = sorted(ways, key=lambda way: (-Fraction(str(ways[way].get("reliability", 1))), way))
        return list(enumerate(order))

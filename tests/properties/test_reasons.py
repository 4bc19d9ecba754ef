"""Every reason that is given is true: checked with networkx, on random studies.

Without a needed variable the criterion fails *and* the named path is open; what is left out cannot
bias, or must not be held; every witness that a route is impossible stands up.
"""

from collections import Counter
from collections.abc import Callable, Iterable
from itertools import pairwise
from pathlib import Path
from typing import Any

import networkx as nx
import pytest

from planner import read_study, recommend
from planner.claims import Claim
from planner.diagram import Diagram
from planner.findings import Reason
from planner.plan import Plan, RouteAnswer
from planner.routes.instrument.criterion import nearest
from planner.study import HIDDEN
from tests.enumeration import Criteria
from tests.properties.test_separation import path_is_open
from tests.random_studies import random_study, text_of

SEEDS = range(2000, 2240)


class Checker:
    """One random study, its criteria by networkx, and how often each kind of reason came up."""

    def __init__(self, study: dict[str, Any], counts: Counter[str]) -> None:
        graph = nx.DiGraph()
        for name, variable in study["variables"].items():
            graph.add_node(name)
            graph.add_edges_from((cause, name) for cause in variable["caused_by"])
        for a, b in study["hidden_common_causes"]:
            graph.add_edges_from((f"{HIDDEN}{a} and {b}", name) for name in (a, b))
        self.selected = set(study.get("selected_by", []))
        self.criteria = Criteria(graph, "x", "y", self.selected)
        self.measurable = {n for n, each in study["variables"].items() if "ways" in each}
        self.counts = counts

    def holds(self, route: str, plan: Plan, without: str = "", holding: str = "") -> bool:
        """Whether a plan passes its criterion, one variable dropped or one more held."""
        covariates = (set(plan.covariates) - {without}) | ({holding} if holding else set())
        mediators, instruments = set(plan.mediators) - {without}, set(plan.instruments) - {without}
        if route == "conditioning":
            return self.criteria.conditioning(covariates)
        if route == "instrument":
            return bool(instruments) and self.criteria.instrument(*instruments, covariates)
        return self.criteria.mechanism(mediators, covariates)

    def given(self, plan: Plan, without: str = "") -> set[str]:
        """What is conditioned on."""
        return (set(plan.covariates) - {without}) | self.selected

    def sides(
        self, route: str, plan: Plan, without: str = ""
    ) -> Iterable[tuple[nx.DiGraph, set[str]]]:
        """The diagrams in which a plan closes paths, with what is held there."""
        given = self.given(plan, without)
        if route in ("conditioning", "instrument"):
            yield self.criteria.noncausal, given
        else:
            yield self.criteria.without_x, given
            mediators = set(plan.mediators) - {without}
            yield self.criteria._without(mediators), given | {"x"}

    def is_open_somewhere(
        self, route: str, plan: Plan, path: tuple[str, ...], without: str = "", holding: str = ""
    ) -> bool:
        """Whether a path is there, and open, in one of the diagrams in which paths must be closed."""
        return any(
            is_there(graph, path) and path_is_open(graph, path, given | ({holding} - {""}))
            for graph, given in self.sides(route, plan, without)
        )

    # ------------------------------------------------------------------------------- needed

    def needed(self, route: str, plan: Plan) -> None:
        """Without each variable the route is closed, and the path that is named shows it."""
        for name, reason in plan.needed.items():
            self.counts[f"needed: {reason.kind}"] += 1
            path = reason.trail.names
            if reason.kind in ("treatment", "outcome"):
                continue
            assert not self.holds(route, plan, without=name)
            match reason.kind:
                case "closes":
                    assert name in path
                    assert self.is_open_somewhere(route, plan, path, without=name)
                    assert not self.is_open_somewhere(route, plan, path)
                case "carries":
                    assert is_directed(self.criteria.graph, path)
                    assert (path[0], path[-1]) == ("x", "y")
                    assert set(path) & set(plan.mediators) == {name}
                case "moves" | "keeps_link":
                    graph = self.criteria.graph
                    assert (path[0], path[-1]) == (*plan.instruments, "x")
                    assert is_there(graph, path)
                    assert path_is_open(graph, path, self.given(plan))
                    if reason.kind == "keeps_link":
                        assert nx.is_d_separator(
                            graph, set(plan.instruments), {"x"}, self.given(plan, name)
                        )
                case _:
                    pytest.fail(reason.kind)

    # ----------------------------------------------------------------------------- left out

    def left_out(self, route: str, plan: Plan) -> None:
        """Each variable that is not measured is either forbidden for a reason, or of no use."""
        assert set(plan.needed) | set(plan.left_out) == self.measurable
        for name, reason in plan.left_out.items():
            self.counts[f"left out: {reason.kind}"] += 1
            self.left_out_reason(route, plan, name, reason)

    def left_out_reason(self, route: str, plan: Plan, name: str, reason: Reason) -> None:
        """One variable that is not measured."""
        path, graph = reason.trail.names, self.criteria.graph
        match reason.kind:
            case "on_causal_path" | "carried":
                assert is_directed(graph, path)
                assert (path[0], path[-1]) == ("x", "y")
                assert name in path[1:-1]
                if reason.kind == "carried":
                    assert set(path) & set(plan.mediators) == set(reason.variables[1:])
            case "below_causal_path" | "after_treatment":
                assert is_directed(graph, path)
                assert (path[0], path[-1]) == ("x", name)
            case "opens":
                assert self.is_open_somewhere(route, plan, path, holding=name)
                assert not self.is_open_somewhere(route, plan, path)
            case "cuts_link":
                held = self.given(plan) | {name}
                assert nx.is_d_separator(graph, set(plan.instruments), {"x"}, held)
            case "unlinked":
                others = set(reason.variables[1:])
                assert any(
                    nx.is_d_separator(diagram, {name}, others, held)
                    for diagram, held in self.sides(route, plan)
                    if not {name} & held
                )
            case "shielded":
                closer = reason.variables[1]
                assert closer in path
                assert closer in plan.covariates
                assert not self.is_open_somewhere(route, plan, path)
                bare = [
                    is_there(diagram, path)
                    and path_is_open(diagram, path, held - set(plan.covariates))
                    for diagram, held in self.sides(route, plan)
                ]
                assert any(bare)
            case "selected":
                assert name in self.selected
            case _:
                pytest.fail(reason.kind)
        if name in plan.never and reason.kind != "after_treatment" and route == "conditioning":
            assert not self.holds(route, plan, holding=name)
        if name in plan.never and route != "conditioning":
            assert not self.holds(route, plan, holding=name)
        if reason.kind in ("unlinked", "shielded"):
            assert self.holds(route, plan, holding=name), "holding it would do no harm"

    # --------------------------------------------------------------------------- impossible

    def impossible(self, answer: RouteAnswer) -> None:
        """What is said to stand in the way does."""
        self.counts[f"impossible: {answer.reason.kind}"] += 1
        before = self.measurable - self.criteria.after - self.selected
        path = answer.reason.trail.names
        graph = self.criteria.graph
        match answer.reason.kind:
            case "no_directed_path":
                assert not nx.has_path(graph, "x", "y")
            case "back_door_open":
                up = nx.ancestors(graph, "x") | nx.ancestors(graph, "y")
                up |= {above for s in self.selected for above in nx.ancestors(graph, s)}
                held = (before & up) | self.selected
                assert path_is_open(self.criteria.noncausal, path, held)
                assert is_there(self.criteria.noncausal, path)
                assert (path[0], path[-1]) == ("x", "y")
            case "no_instrument":
                assert {each.variables[0] for each in answer.witnesses} == (
                    self.measurable - {"x", "y"} - self.selected
                )
                for each in answer.witnesses:
                    self.failed_instrument(each, before)
            case "no_candidate":
                assert self.measurable - self.selected == {"x", "y"}
            case "unmediated":
                assert is_directed(graph, path)
                assert (path[0], path[-1]) == ("x", "y")
                doors = {each.variables[0]: each.trail.names for each in answer.witnesses}
                assert set(doors) == set(path[1:-1]) & self.measurable
                for mediator, door in doors.items():
                    self.open_door(mediator, door, before)
            case _:
                pytest.fail(answer.reason.kind)

    def failed_instrument(self, reason: Reason, before: set[str]) -> None:
        """One candidate fails the condition that is named."""
        self.counts[f"no instrument: {reason.kind}"] += 1
        z, path, graph = reason.variables[0], reason.trail.names, self.criteria.graph
        reach = self.criteria.noncausal
        up = nx.ancestors(reach, z) | nx.ancestors(reach, "y")
        up |= {above for s in self.selected for above in nx.ancestors(reach, s)}
        held = ((before & up) - {z}) | self.selected
        match reason.kind:
            case "comes_after":
                assert is_directed(graph, path)
                assert (path[0], path[-1]) == ("x", z)
            case "reaches_outcome":
                assert is_there(reach, path)
                assert (path[0], path[-1]) == (z, "y")
                assert path_is_open(reach, path, self.nearest(z))
                assert not nx.is_d_separator(reach, {z}, {"y"}, held)
            case "no_link":
                assert nx.is_d_separator(graph, {z}, {"x"}, self.selected)
            case "link_cut":
                assert path_is_open(graph, path, self.selected)
                assert nx.is_d_separator(reach, {z}, {"y"}, self.nearest(z))
                assert nx.is_d_separator(graph, {z}, {"x"}, self.nearest(z))

    def nearest(self, z: str) -> set[str]:
        """The covariates with which a candidate was tried, and S."""
        claim = Claim.of(
            "instrument",
            Diagram.of({n: list(self.criteria.graph.predecessors(n)) for n in self.criteria.graph}),
            "x",
            "y",
            self.selected,
        )
        names = claim.diagram
        before = claim.before(names.nodes(self.measurable))
        return set(names.named(nearest(claim, before, names.numbers[z]))) | self.selected

    def open_door(self, mediator: str, door: tuple[str, ...], before: set[str]) -> None:
        """The back door of a mediator is open with everything held that can be."""
        graph = self.criteria.graph
        up = nx.ancestors(graph, "x") | nx.ancestors(graph, "y")
        up |= {above for s in self.selected for above in nx.ancestors(graph, s)}
        held = (before & up) | self.selected
        if door[0] == "x":
            assert door[-1] == mediator
            assert path_is_open(self.criteria.without_x, door, held)
        else:
            assert (door[0], door[-1]) == (mediator, "y")
            assert path_is_open(graph, door, held | {"x"})
            assert not graph.has_edge(door[0], door[1])


def is_there(graph: nx.DiGraph, path: tuple[str, ...]) -> bool:
    """Whether every step of a path is an arrow of the diagram, either way."""
    return all(graph.has_edge(a, b) or graph.has_edge(b, a) for a, b in pairwise(path))


def is_directed(graph: nx.DiGraph, path: tuple[str, ...]) -> bool:
    """Whether a path follows the arrows."""
    return len(path) > 1 and all(graph.has_edge(a, b) for a, b in pairwise(path))


def test_every_reason_is_true(
    write: Callable[..., Path], capsys: pytest.CaptureFixture[str]
) -> None:
    counts: Counter[str] = Counter()
    for seed in SEEDS:
        study = random_study(seed)
        checker = Checker(study, counts)
        for answer in recommend(read_study(write(text_of(study)))).effects[0].routes:
            plan = answer.plan or answer.beyond
            if plan is not None:
                checker.needed(answer.route, plan)
                checker.left_out(answer.route, plan)
            elif answer.status == "impossible":
                checker.impossible(answer)
    with capsys.disabled():
        print()
        for what, count in sorted(counts.items()):
            print(f"    {count:5} reasons of kind {what}")
    for kind in (
        "needed: closes", "needed: carries", "needed: moves", "left out: on_causal_path",
        "left out: below_causal_path", "left out: after_treatment", "left out: opens", "left out: cuts_link",
        "left out: unlinked", "left out: shielded", "left out: carried", "left out: selected",
        "impossible: back_door_open", "impossible: no_instrument", "impossible: unmediated",
        "no instrument: comes_after", "no instrument: reaches_outcome", "no instrument: no_link",
        "no instrument: link_cut",
    ):  # fmt: skip
        assert counts[kind] > 0, kind

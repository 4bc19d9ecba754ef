"""With additive prices the cheapest conditioning set is a minimum vertex cut in the moral graph.

Smucler & Rotnitzky (2022), Journal of Causal Inference 10, 174-189; van der Zander, Liśkiewicz &
Textor (2019), Artificial Intelligence 270. The cut is found by networkx's maximum flow.
"""

import random
from fractions import Fraction
from math import inf

import networkx as nx
import pytest

from costs.prices import PriceList, Terms, Way
from planner.claims import Claim
from planner.diagram import Diagram
from planner.program import Choice, NothingFound, Within
from planner.search import Deadline, cheapest

SIZE = 14


def random_case(seed: int) -> tuple[dict[str, list[str]], dict[str, int]]:
    """A diagram with treatment x and outcome y, and the price of what can be measured."""
    rng = random.Random(seed)
    order = [f"v{i}" for i in range(SIZE)]
    x, y = sorted(rng.sample(range(SIZE // 2, SIZE), 2))
    order[x], order[y] = "x", "y"
    causes = {
        name: [cause for cause in order[:i] if rng.random() < 0.25] for i, name in enumerate(order)
    }
    causes["y"] = sorted({*causes["y"], "x"})
    priced = {n: rng.randint(1, 9) for n in order if n in ("x", "y") or rng.random() < 0.8}
    return causes, priced | {"x": 0, "y": 0}


def cut_value(causes: dict[str, list[str]], priced: dict[str, int]) -> float:
    """The price of the cheapest vertex cut between x and y; infinite where there is none."""
    graph = nx.DiGraph((cause, effect) for effect, each in causes.items() for cause in each)
    graph.add_nodes_from(causes)
    leading = nx.ancestors(graph, "y") | {"y"}
    after = nx.descendants(graph, "x")
    graph.remove_edges_from([("x", c) for c in list(graph.successors("x")) if c in leading])
    relevant = nx.ancestors(graph, "x") | nx.ancestors(graph, "y") | {"x", "y"}
    moral = nx.moral_graph(graph.subgraph(relevant))
    if moral.has_edge("x", "y"):
        return inf
    flow = nx.DiGraph()
    for node in relevant - {"x", "y"}:
        free = node in priced and node not in after
        flow.add_edge((node, "in"), (node, "out"), **({"capacity": priced[node]} if free else {}))
    for a, b in moral.edges:
        for tail, head in ((a, b), (b, a)):
            out = tail if tail in ("x", "y") else (tail, "out")
            into = head if head in ("x", "y") else (head, "in")
            flow.add_edge(out, into)
    if not (flow.has_node("x") and flow.has_node("y")):
        return 0
    try:
        return nx.maximum_flow_value(flow, "x", "y")
    except nx.NetworkXUnbounded:
        return inf


def test_the_program_finds_the_minimum_cut(capsys: pytest.CaptureFixture[str]) -> None:
    values = []
    for seed in range(150):
        causes, priced = random_case(seed)
        diagram = Diagram.of(causes)
        ways = {n: {"standard": Way(per_unit=Fraction(p))} for n, p in priced.items()}
        within = Within(prices=PriceList(ways=ways, components={}), terms=Terms(records=1))
        claim = Claim.of("conditioning", diagram, "x", "y")
        answer = cheapest([Choice((claim,))], within, deadline=Deadline(60))
        value = inf if isinstance(answer, NothingFound) else answer.bill.total
        assert value == cut_value(causes, priced), seed
        values.append(value)
    with capsys.disabled():
        print(
            f"\n    minimum cuts: {sum(0 < v < inf for v in values)} of {len(values)} cost something"
        )
    assert sum(0 < value < inf for value in values) >= 50
    assert inf in values

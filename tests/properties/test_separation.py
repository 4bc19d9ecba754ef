"""Open paths against networkx's separation and against listing every path."""

import random

import networkx as nx
import pytest

from planner.diagram import Diagram


def random_graph(seed: int, size: int = 8) -> tuple[nx.DiGraph, Diagram, random.Random]:
    """A random diagram, for networkx and for us; node i has the name 'i'."""
    rng = random.Random(seed)
    causes = {str(i): [str(j) for j in range(i) if rng.random() < 0.3] for i in range(size)}
    graph = nx.DiGraph()
    graph.add_nodes_from(range(size))
    graph.add_edges_from((int(c), int(e)) for e, cs in causes.items() for c in cs)
    return graph, Diagram.of(causes), rng


def path_is_open(graph: nx.DiGraph, path: tuple[int, ...], given: set[int]) -> bool:
    """Whether a path is open, written out from the definition."""
    for before, node, after in zip(path, path[1:], path[2:], strict=False):
        meets = graph.has_edge(before, node) and graph.has_edge(after, node)
        if meets and not (nx.descendants(graph, node) | {node}) & given:
            return False
        if not meets and node in given:
            return False
    return True


@pytest.mark.parametrize("seed", range(40))
def test_a_path_is_found_where_networkx_sees_no_separation(seed: int) -> None:
    graph, diagram, rng = random_graph(seed)
    answers = set()
    for _ in range(30):
        a, b, *others = rng.sample(range(8), 8)
        given = frozenset(others[: rng.randint(0, 4)])
        path = diagram.open_path({a}, {b}, given)
        answers.add(path is None)
        assert (path is None) == nx.is_d_separator(graph, {a}, {b}, set(given))
        if path is not None:
            assert (path[0], path[-1]) == (a, b)
            assert len(set(path)) == len(path), "a path passes no node twice"
            assert path_is_open(graph, path, set(given))
    assert answers == {True, False}


@pytest.mark.parametrize("seed", range(20))
def test_no_shorter_path_is_open(seed: int) -> None:
    graph, diagram, rng = random_graph(seed, size=7)
    skeleton = graph.to_undirected()
    for _ in range(10):
        a, b, *others = rng.sample(range(7), 7)
        given = frozenset(others[: rng.randint(0, 3)])
        found = diagram.open_path({a}, {b}, given)
        open_ones = [
            tuple(path)
            for path in nx.all_simple_paths(skeleton, a, b)
            if path_is_open(graph, tuple(path), set(given))
        ]
        assert (len(found) if found else 0) == min(map(len, open_ones), default=0)


@pytest.mark.parametrize("seed", range(20))
def test_groups_are_joined_where_some_of_their_members_are(seed: int) -> None:
    graph, diagram, rng = random_graph(seed)
    for _ in range(10):
        nodes = rng.sample(range(8), 8)
        starts, ends, given = set(nodes[:2]), set(nodes[2:4]), frozenset(nodes[4:6])
        assert diagram.are_separated(starts, ends, given) == nx.is_d_separator(
            graph, starts, ends, set(given)
        )


@pytest.mark.parametrize("seed", range(20))
def test_relatives_are_those_of_networkx(seed: int) -> None:
    graph, diagram, _ = random_graph(seed)
    for node in range(8):
        assert diagram.ancestors([node]) == nx.ancestors(graph, node) | {node}
        assert diagram.descendants([node]) == nx.descendants(graph, node) | {node}
    moral = {frozenset(edge) for edge in diagram.moral_edges(range(8))}
    assert moral == {frozenset(edge) for edge in nx.moral_graph(graph).edges}

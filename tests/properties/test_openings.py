"""What every route can say without a search: whether it is open, and by which roles.

``opening`` gives valid roles just if there are any; ``hindrances`` speaks of the others. Compared
with trying every division of what is measurable into roles, by networkx.
"""

import random
from collections import Counter

import networkx as nx
import pytest

from planner.claims import Claim, Roles
from planner.diagram import Diagram
from planner.routes import ROUTES
from planner.search import in_order, minimal
from tests.enumeration import ROUTES as NAMES
from tests.enumeration import Criteria

GRAPHS = 1200


def random_claims(seed: int) -> tuple[dict[str, Claim], Criteria, frozenset[int]]:
    """The three claims about a random diagram, their criteria by networkx, what is measurable."""
    rng = random.Random(seed)
    size = rng.randint(5, 7)
    density = rng.choice([0.25, 0.4, 0.55])
    names = [f"v{i}" for i in range(size)]
    causes = {n: [m for m in names[:i] if rng.random() < density] for i, n in enumerate(names)}
    x, y = sorted(rng.sample(range(size), 2))
    if rng.random() < 0.4:
        names.append("u")
        for end in (names[x], names[y]):
            causes[end].append("u")
        causes["u"] = []
    diagram = Diagram.of(causes)
    graph = nx.DiGraph((cause, name) for name, each in causes.items() for cause in each)
    graph.add_nodes_from(names)
    free = [v for v in range(size) if v not in diagram.descendants([x])]
    selected = [names[v] for v in free if rng.random() < 0.15]
    claims = {r: Claim.of(r, diagram, names[x], names[y], selected) for r in NAMES}
    measurable = frozenset(v for v in range(size) if v in (x, y) or rng.random() < 0.65)
    return claims, Criteria(graph, names[x], names[y], set(selected)), measurable


def test_a_route_is_open_just_where_some_roles_are_valid(
    capsys: pytest.CaptureFixture[str],
) -> None:
    counts: Counter[str] = Counter()
    for seed in range(GRAPHS):
        claims, criteria, measurable = random_claims(seed)
        if claims["conditioning"].is_about_nothing:
            continue
        named = set(claims["conditioning"].diagram.named(measurable))
        open_by = criteria.opening_sets(named)
        for route, claim in claims.items():
            roles = ROUTES[route].criterion.opening(claim, measurable)
            assert (roles is not None) == bool(open_by[route]), (seed, route)
            counts[f"{route} {'closed' if roles is None else 'open'}"] += 1
            if roles is None:
                assert ROUTES[route].reasons.hindrances(claim, measurable), (seed, route)
            else:
                assert ROUTES[route].is_valid(claim, roles)
                assert roles.nodes <= measurable
    with capsys.disabled():
        print(f"\n    random diagrams: {dict(sorted(counts.items()))}")
    assert min(counts.values()) >= 50
    assert len(counts) == 6


def test_whoever_can_be_spared_is() -> None:
    """From any valid roles, until none of those left could be dropped alone."""
    spared = 0
    for seed in range(GRAPHS):
        claims, _, measurable = random_claims(seed)
        rng = random.Random(seed)
        for route, claim in claims.items():
            roles = random_roles(route, claim, measurable, rng)
            if claim.is_about_nothing or not ROUTES[route].is_valid(claim, roles):
                continue
            few = in_order(claim, minimal(claim, roles))
            spared += len(few.nodes) < len(roles.nodes)
            assert ROUTES[route].is_valid(claim, few)
            assert few.nodes <= roles.nodes
            for node in few.nodes:
                assert not ROUTES[route].is_valid(claim, few.without(node))
                assert ROUTES[route].reasons.needed(claim, few, node).kind
    assert spared > 30


def random_roles(route: str, claim: Claim, measurable: frozenset[int], rng: random.Random) -> Roles:
    """A random division of some measurable nodes into the roles of a route."""
    able = ROUTES[route].criterion.candidates(claim, measurable)
    some = frozenset(v for v in able.covariates if rng.random() < 0.7)
    if route == "instrument" and able.instruments:
        z = rng.choice(sorted(able.instruments))
        return Roles(instruments=frozenset((z,)), covariates=some - {z})
    return Roles(covariates=some, mediators=able.mediators)


@pytest.mark.parametrize(
    ("causes", "roles", "left"),
    [
        # c → x, c → a ← b → y, x → y: without c, a need not be held either.
        (
            {"c": [], "b": [], "a": ["c", "b"], "x": ["c"], "y": ["x", "b"]},
            {"covariates": ["a", "c"]},
            {},
        ),
        # c → x → y, c → a ← b: b is an instrument given a; seen the other way round, a is one by itself.
        (
            {"c": [], "b": [], "a": ["c", "b"], "x": ["c"], "y": ["x"]},
            {"instruments": ["b"], "covariates": ["a"]},
            {"instruments": ["a"]},
        ),
    ],
)
def test_dropping_one_can_make_another_dispensable(
    causes: dict[str, list[str]], roles: dict[str, list[str]], left: dict[str, list[str]]
) -> None:
    diagram = Diagram.of(causes)
    claim = Claim.of("instrument" if "instruments" in roles else "conditioning", diagram, "x", "y")
    given = Roles(**{role: diagram.nodes(names) for role, names in roles.items()})
    wanted = Roles(**{role: diagram.nodes(names) for role, names in left.items()})
    assert in_order(claim, minimal(claim, given)) == wanted

"""Precision: against the limit law of a covariance matrix, against simulation, and worked by hand."""

import random
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from itertools import chain, combinations
from math import inf, sqrt
from pathlib import Path
from statistics import NormalDist

import numpy as np
import pytest

from planner import read_study, recommend
from planner.claims import Claim, Roles
from planner.diagram import Diagram
from planner.limits import demand_of
from planner.linear import LinearModel, implied_effect
from planner.plan import Plan
from planner.precision import (
    Demand,
    Estimate,
    Matrix,
    Parts,
    Precision,
    as_read,
    bias_of,
    covariance,
    forgiving_ceil,
    keep_of,
    partial,
    precision_of,
)
from planner.routes import ROUTES
from planner.study import Effect, Study

NORMAL = NormalDist()
REPLICATIONS = 4000


@pytest.fixture
def study_of(write: Callable[..., Path]) -> Callable[[str], Study]:
    """Read a study."""
    return lambda text: read_study(write(text))


def plan_of(study: Study, route: str) -> Plan:
    """The plan of a route that is feasible."""
    plan = recommend(study).effects[0].answer(route).plan
    assert plan is not None
    return plan


# --------------------------------------------------------------------------------- random models


def random_model(rng: random.Random, count: int, density: float = 0.6) -> LinearModel:
    """Variables v0, v1, …, each with random causes among the earlier ones, explained to 70 % at most."""
    sigma = np.eye(count)
    coefficients: dict[str, dict[str, float]] = {}
    for row in range(count):
        causes = [cause for cause in range(row) if rng.random() < density]
        b = np.array([rng.choice([-1, 1]) * rng.uniform(0.2, 0.8) for _ in causes])
        explained = b @ sigma[np.ix_(causes, causes)] @ b if causes else 0.0
        b *= min(1.0, sqrt(rng.uniform(0.3, 0.7) / explained)) if explained else 1.0
        sigma[row, :row] = b @ sigma[np.ix_(causes, range(row))]
        sigma[:row, row] = sigma[row, :row]
        coefficients[f"v{row}"] = {f"v{cause}": float(b[i]) for i, cause in enumerate(causes)}
    names = tuple(coefficients)
    return LinearModel(names=names, coefficients=coefficients, effect=0.0)


def structural(model: LinearModel) -> Matrix:
    """(I − B)⁻¹ D (I − B)⁻ᵀ, with the noise D solved for so that every variance is 1."""
    at = {name: row for row, name in enumerate(model.names)}
    b = np.zeros((len(at), len(at)))
    for name, causes in model.coefficients.items():
        for cause, coefficient in causes.items():
            b[at[name], at[cause]] = coefficient
    ahead = np.linalg.inv(np.eye(len(at)) - b)
    noise = np.linalg.solve(ahead**2, np.ones(len(at)))
    assert (noise > 0).all()
    found: Matrix = (ahead * noise) @ ahead.T
    return found


def random_case(route: str, seed: int) -> tuple[Matrix, Parts]:
    """A covariance of readings, some of them noisy, and who plays which part."""
    rng = random.Random(f"{route} {seed}")
    while True:
        mediators = rng.randint(1, 3) if route == "mechanism" else 0
        instruments = 1 if route == "instrument" else 0
        covariates = rng.randint(0, 4)
        # One or two variables are left over: unmeasured, they do not show.
        count = 2 + mediators + instruments + covariates + rng.randint(1, 2)
        sigma = structural(random_model(rng, count))
        noisy = {row: 1 / rng.uniform(0.4, 1) - 1 for row in range(count) if rng.random() < 0.4}
        x, y, *others = rng.sample(range(count), count)
        m, z = others[:mediators], others[mediators : mediators + instruments]
        w = others[mediators + instruments :][:covariates]
        parts = Parts(x=x, y=y, w=tuple(w), z=tuple(z), m=tuple(m))
        read = as_read(sigma, noisy)
        # An instrument that moves nothing has no estimate; no effect, no share of it.
        moves = not z or partial(read, w)[x, z[0]] ** 2 > 0.03
        if moves and abs(float(textbook(route, read, parts))) > 0.02:
            return read, parts


def gradient(limit: Callable[[Matrix], float], sigma: Matrix, step: float = 1e-5) -> Matrix:
    """G with dβ = tr(G dΣ), by central differences; dΣ is symmetric, and so is G."""
    g = np.zeros_like(sigma)
    for i, j in zip(*np.triu_indices(len(sigma)), strict=True):
        change = np.zeros_like(sigma)
        change[i, j] = change[j, i] = step
        slope = (limit(sigma + change) - limit(sigma - change)) / (2 * step)
        g[i, j] = g[j, i] = slope if i == j else slope / 2
    return g


@pytest.mark.parametrize("seed", range(40))
@pytest.mark.parametrize("route", ROUTES)
def test_variance_is_that_of_the_limit_law(route: str, seed: int) -> None:
    """V = 2 tr(ΣGΣG): a sample covariance S varies so that n · Var(tr GS) tends to it (Wishart)."""
    sigma, parts = random_case(route, seed)
    estimator = ROUTES[route].precision
    g = gradient(lambda s: estimator.limit(s, parts), sigma)
    expected = 2 * np.trace(sigma @ g @ sigma @ g)
    assert estimator.estimate(sigma, parts).variance == pytest.approx(expected, rel=1e-6)


def slopes(s: Matrix, outcome: int, on: Sequence[int]) -> Matrix:
    """Coefficients of an ordinary regression, by the normal equations; one for each sample."""
    return np.linalg.solve(take(s, on, on), take(s, on, [outcome]))[..., 0]


def take(s: Matrix, rows: Sequence[int], columns: Sequence[int]) -> Matrix:
    """A block of one matrix or of many."""
    return s[..., list(rows), :][..., list(columns)]


def textbook(route: str, s: Matrix, parts: Parts) -> Matrix:
    """The estimate as regressions print it, for one covariance matrix or for many."""
    x, y, w, z, m = parts.x, parts.y, parts.w, parts.z, parts.m
    if route == "conditioning":
        return slopes(s, y, [x, *w])[..., 0]
    if route == "instrument":
        # First stage x on z and w; second stage y on what that fits, and w.
        first, second = [*z, *w], [x, *w]
        fitted = np.linalg.solve(take(s, first, first), take(s, first, second))
        fitted_t = np.swapaxes(fitted, -1, -2)
        squares = fitted_t @ take(s, first, first) @ fitted
        return np.linalg.solve(squares, fitted_t @ take(s, first, [y]))[..., 0, 0]
    a = np.stack([slopes(s, each, [x, *w])[..., 0] for each in m], axis=-1)
    b = slopes(s, y, [*m, x, *w])[..., : len(m)]
    return (a * b).sum(axis=-1)


@pytest.mark.parametrize("seed", range(40))
@pytest.mark.parametrize("route", ROUTES)
def test_limit_is_that_of_ordinary_regressions(route: str, seed: int) -> None:
    sigma, parts = random_case(route, seed)
    found, expected = ROUTES[route].precision, float(textbook(route, sigma, parts))
    assert found.limit(sigma, parts) == pytest.approx(expected)
    assert found.estimate(sigma, parts).limit == pytest.approx(expected)


@pytest.mark.parametrize("seed", range(20))
def test_what_an_instrument_costs(seed: int) -> None:
    """(SE_iv / SE_ols)² = (ratio of the error variances) / (partial ρ² of z and x), for any data.

    Without confounding the errors are alike, and what is left is 1/ρ².
    """
    sigma, parts = random_case("instrument", seed)
    x, y, (z,) = parts.x, parts.y, parts.z
    s = partial(sigma, parts.w)
    iv = ROUTES["instrument"].precision.estimate(sigma, parts)
    ols = ROUTES["conditioning"].precision.estimate(sigma, replace(parts, z=()))
    rho2 = s[x, z] ** 2 / (s[x, x] * s[z, z])
    s_rr = s[y, y] - 2 * iv.limit * s[x, y] + iv.limit**2 * s[x, x]
    s_yy = s[y, y] - s[x, y] ** 2 / s[x, x]
    assert iv.variance / ols.variance == pytest.approx(s_rr / s_yy / rho2)
    assert iv.strength == pytest.approx(rho2 / (1 - rho2))


def subsets(nodes: Sequence[int]) -> Iterator[frozenset[int]]:
    """Every subset."""
    sizes = range(len(nodes) + 1)
    return map(frozenset, chain.from_iterable(combinations(nodes, size) for size in sizes))


def test_every_valid_set_leads_to_the_effect() -> None:
    """All subsets that the plain check accepts, of all routes, some given a selection S: β = τ."""
    checked = dict.fromkeys(ROUTES, 0)
    for seed in range(80):
        rng = random.Random(seed)
        model = random_model(rng, 6, density=0.4)
        diagram = Diagram.of(model.coefficients)
        effect = Effect(treatment="v2", outcome=rng.choice(["v4", "v5"]))
        tau = implied_effect(model.coefficients, model.names, effect)
        selected = ("v0",) if seed % 3 == 0 else ()
        sigma = covariance(model, selected)
        for route, claim in claims(diagram, effect, selected):
            for roles in possible_roles(route, claim, unmeasurable=seed % 2):
                if claim.is_about_nothing or not ROUTES[route].is_valid(claim, roles):
                    continue
                w, z, m = map(tuple, (roles.covariates, roles.instruments, roles.mediators))
                parts = Parts(x=claim.treatment, y=claim.outcome, w=w, z=z, m=m)
                found = ROUTES[route].precision.limit(sigma, parts)
                assert found == pytest.approx(tau, abs=1e-9), (seed, route, roles)
                checked[route] += 1
    assert min(checked.values()) > 20, checked


def claims(
    diagram: Diagram, effect: Effect, selected: tuple[str, ...]
) -> Iterator[tuple[str, Claim]]:
    """The claim of each route."""
    for route in ROUTES:
        yield route, Claim.of(route, diagram, effect.treatment, effect.outcome, selected)


def possible_roles(route: str, claim: Claim, unmeasurable: int) -> Iterator[Roles]:
    """All that a route could try, without one unmeasurable variable."""
    others = sorted(set(range(6)) - claim.ends - claim.selected - {unmeasurable})
    for first in subsets(others):
        if (route == "conditioning" and first) or (route == "instrument" and len(first) != 1):
            continue
        for w in subsets([each for each in others if each not in first]):
            instruments = first if route == "instrument" else frozenset()
            mediators = first if route == "mechanism" else frozenset()
            yield Roles(covariates=w, instruments=instruments, mediators=mediators)


# ------------------------------------------------------------------------------------- covariance


@pytest.mark.parametrize("seed", range(20))
def test_covariance_is_that_of_the_equations(seed: int) -> None:
    model = random_model(random.Random(seed), 4 + seed % 6)
    assert covariance(model) == pytest.approx(structural(model))


@pytest.mark.parametrize("seed", range(10))
def test_covariance_given_a_selection_is_the_conditional_one(seed: int) -> None:
    rng = random.Random(seed)
    model = random_model(rng, 7)
    given = sorted(rng.sample(range(7), 1 + seed % 2))
    free = [row for row in range(7) if row not in given]
    sigma = structural(model)
    across = sigma[np.ix_(free, given)]
    expected = sigma[np.ix_(free, free)] - across @ np.linalg.inv(sigma[np.ix_(given, given)]) @ (
        across.T
    )
    found = covariance(model, [model.names[row] for row in given])
    assert found[np.ix_(free, free)] == pytest.approx(expected)
    assert found[given] == pytest.approx(0, abs=1e-12)


def test_selecting_rows_gives_the_covariance_given_the_selection() -> None:
    """A million units of six variables, of which those are kept whose v3 lies within 0.5 ± 0.05.

    About 35,000 are left: a covariance varies by √((s_ii s_jj + s_ij²)/35,000) ≤ 0.0076; five of
    them are allowed, and the 0.0008 that the width of the band leaves of the variance of v3.
    """
    model = random_model(random.Random(5), 6)
    rng = np.random.default_rng(5)
    values: dict[str, np.ndarray] = {}
    for name in model.names:
        known = sum((b * values[cause] for cause, b in model.coefficients[name].items()), 0.0)
        left = 1 - (np.var(known) if model.coefficients[name] else 0.0)
        values[name] = known + sqrt(left) * rng.standard_normal(1_000_000)
    rows = np.abs(values["v3"] - 0.5) < 0.05
    assert 30_000 < rows.sum() < 40_000
    kept = np.cov(np.array([values[name][rows] for name in model.names]))
    assert np.abs(kept - covariance(model, ["v3"])).max() < 0.04
    assert np.abs(kept - covariance(model)).max() > 0.2


# ------------------------------------------------------------------------------------- simulation

CASES = {
    "conditioning": """\
variables:
  c: {per_unit: 1}
  d: {caused_by: {c: 0.3}, per_unit: 1}
  x: {caused_by: {c: 0.3, d: -0.3}, per_unit: 1}
  y: {caused_by: {x: 0.25, c: 0.3, d: 0.3}, per_unit: 1}
""",
    "conditioning, poor readings": """\
variables:
  c: {per_unit: 1, reliability: 0.7}
  x: {caused_by: {c: 0.4}, per_unit: 1, reliability: 0.7}
  y: {caused_by: {x: 0.3, c: 0.15}, per_unit: 1, reliability: 0.8}
""",
    "conditioning, selected": """\
variables:
  u: {measurable: no}
  c: {per_unit: 1}
  r: {caused_by: {u: 0.6, c: 0.5}, measurable: no}
  x: {caused_by: {u: 0.5, c: 0.3}, per_unit: 1, reliability: 0.8}
  y: {caused_by: {x: 0.3, c: 0.4}, per_unit: 1}
selected_by: [r]
""",
    "instrument": """\
variables:
  w: {per_unit: 1}
  z: {caused_by: {w: 0.3}, per_unit: 1}
  x: {caused_by: {z: 0.55}, per_unit: 1}
  y: {caused_by: {x: 0.15, w: 0.4}, per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.25}]
""",
    "instrument, poor readings": """\
variables:
  z: {per_unit: 1, reliability: 0.8}
  x: {caused_by: {z: 0.6}, per_unit: 1, reliability: 0.8}
  y: {caused_by: {x: 0.3}, per_unit: 1, reliability: 0.7}
hidden_common_causes: [{of: [x, y], strength: -0.2}]
""",
    "mechanism": """\
variables:
  c: {per_unit: 1}
  x: {caused_by: {c: 0.3}, per_unit: 1}
  m: {caused_by: {x: 0.7, c: 0.2}, per_unit: 1}
  y: {caused_by: {m: 0.25}, per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.2}]
""",
    "mechanism, poor readings": """\
variables:
  x: {per_unit: 1}
  k: {caused_by: {x: 0.7}, per_unit: 1, reliability: 0.8}
  m: {caused_by: {x: 0.5, k: 0.2}, per_unit: 1, reliability: 0.7}
  y: {caused_by: {m: 0.15, k: 0.15}, per_unit: 1, reliability: 0.9}
hidden_common_causes: [{of: [x, y], strength: 0.2}]
""",
}
every_case = pytest.mark.parametrize("case", CASES)


def route_of(case: str) -> str:
    """The route that a case is about."""
    return case.partition(",")[0]


def sized(case: str, size: str) -> str:
    """A study that only its route can answer."""
    route = route_of(case)
    head = f"effect: {{treatment: x, outcome: y}}\nsize: {size}\nroutes: [{route}]\n"
    return head + CASES[case]


class Studies:
    """Many studies done as planned, each analysed as regressions in a textbook are."""

    def __init__(self, study: Study, plan: Plan, route: str, records: int, seed: int) -> None:
        (effect,) = study.effects
        demand = demand_of(study, effect)
        assert demand is not None
        roles = [plan.covariates, plan.instruments, plan.mediators]
        names = [effect.treatment, effect.outcome, *chain(*roles)]
        rows = [demand.rows[name] for name in names]
        ways = [study.prices.ways[name][plan.buy.measure[name]] for name in names]
        noise = np.diag([float(1 / way.reliability) - 1 for way in ways])
        parts = parts_of(names, *roles)
        squares = wishart(demand.sigma[np.ix_(rows, rows)] + noise, records - 1, seed)
        self.demand = demand
        self.estimates = textbook(route, squares, parts)
        self.errors = np.sqrt(squared_error(route, squares, parts, records))

    def power(self) -> float:
        """How often the effect was found, with its sign."""
        found = np.sign(self.demand.effect) * self.estimates > self.demand.z * self.errors
        return float(found.mean())

    def coverage(self, of: float) -> float:
        """How often an interval held a number."""
        return float(np.mean(np.abs(self.estimates - of) < self.demand.z * self.errors))


def parts_of(
    names: Sequence[str],
    w: Sequence[str] = (),
    z: Sequence[str] = (),
    m: Sequence[str] = (),
    treatment: str = "x",
    outcome: str = "y",
) -> Parts:
    """Who plays which part, by place among the names."""
    at = {name: place for place, name in enumerate(names)}

    def rows(part: Sequence[str]) -> tuple[int, ...]:
        return tuple(at[name] for name in part)

    return Parts(x=at[treatment], y=at[outcome], w=rows(w), z=rows(z), m=rows(m))


def wishart(sigma: Matrix, freedom: int, seed: int, count: int = REPLICATIONS) -> Matrix:
    """Sums of squares and products about the mean, of normal samples (Bartlett 1933)."""
    rng = np.random.default_rng(seed)
    size = len(sigma)
    a = np.tril(rng.standard_normal((count, size, size)), -1)
    a[:, range(size), range(size)] = np.sqrt(
        rng.chisquare(freedom - np.arange(size), (count, size))
    )
    root = np.linalg.cholesky(sigma) @ a
    found: Matrix = root @ np.swapaxes(root, -1, -2)
    return found


def squared_error(route: str, s: Matrix, parts: Parts, records: int) -> np.ndarray:
    """The squared standard error as regressions print it; a product's by the delta method."""
    x, y, w, z, m = parts.x, parts.y, parts.w, parts.z, parts.m
    if route == "conditioning":
        return error_covariance(s, y, [x, *w], records)[:, 0, 0]
    if route == "instrument":
        first, second = [*z, *w], [x, *w]
        c = np.linalg.solve(take(s, first, second), take(s, first, [y]))
        crossed = take(s, [y], second) @ c
        rest = (
            s[:, y, y] - (2 * crossed - np.swapaxes(c, 1, 2) @ take(s, second, second) @ c)[:, 0, 0]
        )
        fitted = np.linalg.solve(take(s, first, first), take(s, first, second))
        moved = take(s, second, first) @ fitted
        return rest / (records - 1 - len(second)) * np.linalg.inv(moved)[:, 0, 0]
    on = [x, *w]
    a = np.stack([slopes(s, each, on)[:, 0] for each in m], axis=-1)
    b = slopes(s, y, [*m, *on])[:, : len(m)]
    left = take(s, m, m) - take(s, m, on) @ np.linalg.solve(take(s, on, on), take(s, on, m))
    of_a = left / (records - 1 - len(on)) * np.linalg.inv(take(s, on, on))[:, :1, :1]
    of_b = error_covariance(s, y, [*m, *on], records)[:, : len(m), : len(m)]
    return np.einsum("ri,rij,rj->r", b, of_a, b) + np.einsum("ri,rij,rj->r", a, of_b, a)


def error_covariance(s: Matrix, outcome: int, on: Sequence[int], records: int) -> Matrix:
    """Covariance of the coefficients of an ordinary regression with an intercept."""
    c = slopes(s, outcome, on)
    rest = s[:, outcome, outcome] - (c * take(s, on, [outcome])[..., 0]).sum(axis=-1)
    variance = rest / (records - 1 - len(on))
    found: Matrix = variance[:, None, None] * np.linalg.inv(take(s, on, on))
    return found


@every_case
def test_many_studies_vary_as_said(case: str, study_of: Callable[[str], Study]) -> None:
    """On 400 records: mean, variance and coverage of 4,000 studies.

    A variance of 4,000 numbers is off by a share of √(2/4,000) = 2.2 %: four of them are allowed,
    and 2/400 of what V leaves out. A mean is off by 1/√4,000 of their spread; an instrument's
    estimate also by 2·V/400 (the bias of two-stage least squares). Coverage: four times
    √(0.25/4,000) = 0.8 %.
    """
    study, route = study_of(sized(case, "{records: 400}")), route_of(case)
    plan = plan_of(study, route)
    said = plan.precision
    assert said is not None
    done = Studies(study, plan, route, 400, seed=1)
    scaled = done.estimates.var(ddof=1) * (400 - len(plan.buy.measure) - 1)
    assert scaled == pytest.approx(said.variance, rel=4 * sqrt(2 / REPLICATIONS) + 2 / 400)
    off = 4 * sqrt(said.variance / 400 / REPLICATIONS)
    off += 2 * said.variance / 400 if route == "instrument" else 0.0
    assert done.estimates.mean() == pytest.approx(said.limit, abs=off)
    assert done.coverage(said.effect) == pytest.approx(said.coverage, abs=0.032)
    assert done.coverage(said.limit) == pytest.approx(0.95, abs=0.02)
    width = done.demand.z * done.errors.mean() / keep_of(said.limit, said.effect)
    assert width == pytest.approx(said.half_width, rel=0.03)


@every_case
def test_planned_power_is_reached(case: str, study_of: Callable[[str], Study]) -> None:
    """0.80 planned at what the readings leave of the effect, within 0.03 in 4,000 studies.

    Sized for the true effect instead, studies with poor readings would fall short of it.
    """
    study, route = study_of(sized(case, "{detect: implied, power: 0.8}")), route_of(case)
    plan = plan_of(study, route)
    records, said = plan.buy.bill.records, plan.precision
    assert said is not None
    assert Studies(study, plan, route, records, seed=2).power() == pytest.approx(0.8, abs=0.03)
    keep = keep_of(said.limit, said.effect)
    if keep < 0.9:
        naive = round(records * keep**2)
        assert Studies(study, plan, route, naive, seed=2).power() < 0.66


@pytest.mark.parametrize(
    ("route", "text", "least", "most"),
    [
        (
            "mechanism",
            """\
variables:
  x: {per_unit: 1}
  m: {caused_by: {x: 0.5}, per_unit: 1}
  y: {caused_by: {m: 0.5}, per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.2}]
""",
            0.85,
            0.95,
        ),
        (
            "instrument",
            """\
variables:
  z: {per_unit: 1}
  x: {caused_by: {z: 0.4}, per_unit: 1}
  y: {caused_by: {x: 0.5}, per_unit: 1}
hidden_common_causes: [{of: [x, y], strength: 0.25}]
""",
            0.64,
            0.79,
        ),
    ],
    ids=["a product of two uncertain paths", "an instrument near the floor"],
)
def test_where_the_normal_law_is_rough(
    route: str, text: str, least: float, most: float, study_of: Callable[[str], Study]
) -> None:
    """V/n is the law of large samples. For a planned power of 0.80 simulation gives about 0.90 where
    both paths of a product are equally uncertain, and about 0.73 where an instrument is just as
    strong as it has to be and the confounding pulls the estimate its way.
    """
    head = "effect: {treatment: x, outcome: y}\nsize: {detect: implied}\n"
    study = study_of(f"{head}routes: [{route}]\n{text}")
    plan = plan_of(study, route)
    done = Studies(study, plan, route, plan.buy.bill.records, seed=3)
    assert least < done.power() < most


def many_covariates(count: int) -> str:
    """Confounders c1, c2, …, all of them needed; n = 60 without a thought for their number."""
    names = [f"c{number}" for number in range(1, count + 1)]
    causes = "".join(f", {name}: 0.1" for name in names)
    return "\n".join(
        [
            "effect: {treatment: x, outcome: y}",
            "size: {detect: implied, power: 0.8}",
            "routes: [conditioning]",
            "variables:",
            f"  x: {{caused_by: {{{causes[2:]}}}, per_unit: 1}}",
            f"  y: {{caused_by: {{x: 0.309{causes}}}, per_unit: 1}}",
            *(f"  {name}: {{per_unit: 1}}" for name in names),
            "",
        ]
    )


def test_many_covariates_take_their_degrees_of_freedom(study_of: Callable[[str], Study]) -> None:
    """20 covariates: on the 60 records that V alone asks for, power is 0.58, not the planned 0.80."""
    study = study_of(many_covariates(20))
    plan = plan_of(study, "conditioning")
    assert plan.buy.bill.records == 60 + 22 + 1
    powers = {}
    for records in (60, 83):
        done = Studies(study, plan, "conditioning", records, seed=4)
        # The quantile of Student's t, as a regression prints it, by its expansion in 1/freedom.
        z, freedom = done.demand.z, records - 22
        t = z + (z**3 + z) / (4 * freedom) + (5 * z**5 + 16 * z**3 + 3 * z) / (96 * freedom**2)
        powers[records] = float(np.mean(done.estimates > t * done.errors))
    assert powers[60] == pytest.approx(0.585, abs=0.03)
    assert powers[83] == pytest.approx(0.795, abs=0.025)


def test_clusters_inflate_a_contrast_by_both_icc() -> None:
    """1 + (m − 1) · icc_x · icc_y (Moulton 1986): 60 clusters of 20, icc 0.3 and 0.2, 3,000 studies.

    A variance of 3,000 slopes is off by √(2/3,000) = 2.6 %; four of them are allowed. The design
    effect of a mean would be 4.8.
    """
    rng = np.random.default_rng(6)
    clusters, m, count = 60, 20, 3_000

    def readings(icc: float) -> np.ndarray:
        shared = sqrt(icc) * rng.standard_normal((count, clusters, 1))
        found: np.ndarray = shared + sqrt(1 - icc) * rng.standard_normal(
            (count, clusters, m), dtype=np.float32
        )
        return found.reshape(count, -1)

    x, noise = readings(0.3), readings(0.2)
    x -= x.mean(axis=1, keepdims=True)
    estimates = (x * noise).sum(axis=1) / (x * x).sum(axis=1)
    found = estimates.var() * clusters * m
    assert found == pytest.approx(1 + 19 * 0.3 * 0.2, rel=4 * sqrt(2 / count))


# ------------------------------------------------------------------------------------------- bias


def three(rho: float, tau: float, g: float) -> Matrix:
    """Covariance of c, x and y with c → x (ρ), x → y (τ) and c → y (g)."""
    xy, cy = tau + g * rho, g + tau * rho
    return np.array([[1, rho, cy], [rho, 1, xy], [cy, xy, 1]])


@pytest.mark.parametrize(
    ("rho", "tau", "g", "reliability"), [(0.4, 0.3, 0.5, 0.7), (-0.6, 0.2, 0.3, 0.4)]
)
def test_a_confounder_read_poorly_is_half_adjusted_for(
    rho: float, tau: float, g: float, reliability: float
) -> None:
    """What is left is g·ρ(1 − λ)/(1 − λρ²)."""
    parts = Parts(x=1, y=2, w=(0,))
    noise = {0: 1 / reliability - 1}
    left = g * rho * (1 - reliability) / (1 - reliability * rho**2)
    estimator, sigma = ROUTES["conditioning"].precision, three(rho, tau, g)
    assert estimator.limit(as_read(sigma, noise), parts) == pytest.approx(tau + left)
    bound, singles = bias_of(estimator, sigma, parts, noise, tau)
    assert bound == pytest.approx(abs(left / tau))
    assert singles == {0: pytest.approx(abs(left / tau))}


def test_two_poor_readings_on_one_path_are_seen_together() -> None:
    """x ← a → b → y, a and b read with reliability 0.4: each alone does no harm, both leave 39 %.

    With α = 0.6, δ = 0.5 and γ = 0.7 on the three arrows and τ = 0.24, and a* and b* of variance
    2.5: s_xb.a*b* = αδ · 2.25/(6.25 − δ²) = 0.1125, s_xx.a*b* = 1 − α²(2.5 + 0.5δ²)/(6.25 − δ²)
    = 0.8425; the bias is γ · 0.1125/0.8425 = 0.0935.
    """
    model = LinearModel(
        names=("a", "b", "x", "y"),
        coefficients={"a": {}, "b": {"a": 0.5}, "x": {"a": 0.6}, "y": {"b": 0.7, "x": 0.24}},
        effect=0.24,
    )
    sigma, parts = covariance(model), Parts(x=2, y=3, w=(0, 1))
    estimator = ROUTES["conditioning"].precision
    for row in (0, 1):
        assert bias_of(estimator, sigma, parts, {row: 1.5}, 0.24)[0] == pytest.approx(0, abs=1e-12)
    bound, singles = bias_of(estimator, sigma, parts, {0: 1.5, 1: 1.5}, 0.24)
    assert singles == {0: pytest.approx(0, abs=1e-12), 1: pytest.approx(0, abs=1e-12)}
    assert bound == pytest.approx(0.7 * 0.1125 / 0.8425 / 0.24)
    assert bound == pytest.approx(0.39, abs=0.001)


def test_errors_that_cancel_are_added_up_all_the_same() -> None:
    """A treatment read at 0.8 loses what a confounder read at 0.7 leaves: β = τ, and no plan may lean on it.

    s_xx.c* = 1.25 − 0.7ρ², s_xy.c* = τ(1 − 0.7ρ²) + 0.3gρ: with ρ = 0.5 and τ = 0.3 they fit at
    g = 0.5. Alone, the treatment loses 0.25/(1.25 − ρ²) = 25 %, the confounder adds
    gρ · 0.3/(1 − 0.7ρ²)/τ = 30.3 %, and together they differ from the sum by 5.3 %.
    """
    estimator, sigma = ROUTES["conditioning"].precision, three(0.5, 0.3, 0.5)
    parts, noise = Parts(x=1, y=2, w=(0,)), {1: 0.25, 0: 1 / 0.7 - 1}
    assert estimator.limit(as_read(sigma, noise), parts) == pytest.approx(0.3)
    bound, singles = bias_of(estimator, sigma, parts, noise, 0.3)
    alone = {0: 0.25 * 0.3 / (1 - 0.7 * 0.25) / 0.3, 1: 0.25}
    assert singles == {row: pytest.approx(share) for row, share in alone.items()}
    assert bound == pytest.approx(alone[0] + alone[1] + (alone[0] - alone[1]))


@pytest.mark.parametrize("seed", range(30))
@pytest.mark.parametrize("route", ROUTES)
def test_the_bound_holds(route: str, seed: int) -> None:
    """bound ≥ |β − τ|/|τ|, and ≥ each single bias; τ is β without errors."""
    rng = random.Random(seed)
    sigma, parts = random_case(route, seed)
    estimator = ROUTES[route].precision
    noise = {row: 1 / rng.uniform(0.2, 1) - 1 for row in range(len(sigma)) if rng.random() < 0.7}
    tau = estimator.limit(sigma, parts)
    bound, singles = bias_of(estimator, sigma, parts, noise, tau)
    off = abs(estimator.limit(as_read(sigma, noise), parts) - tau) / abs(tau)
    assert bound >= off * (1 - 1e-9)
    assert bound >= sum(singles.values()) * (1 - 1e-9)
    read = {parts.x, *parts.w, *parts.z, *parts.m} & {row for row, e in noise.items() if e}
    assert set(singles) == read


@pytest.mark.parametrize("route", ROUTES)
def test_noise_in_the_outcome_biases_nothing(route: str) -> None:
    """It costs precision only, on every route."""
    for seed in range(10):
        sigma, parts = random_case(route, seed)
        estimator = ROUTES[route].precision
        exact, poor = (
            estimator.estimate(as_read(sigma, noise), parts) for noise in ({}, {parts.y: 1.0})
        )
        assert poor.limit == pytest.approx(exact.limit)
        assert poor.variance > exact.variance
        bound, singles = bias_of(estimator, sigma, parts, {parts.y: 1.0}, exact.limit)
        assert (bound, singles) == (pytest.approx(0, abs=1e-12), {})


def test_noise_at_an_instrument_biases_nothing_but_by_its_covariates() -> None:
    """z, x and y may be read poorly; a covariate that is needed may not."""
    estimator, touched = ROUTES["instrument"].precision, 0
    for seed in range(20):
        sigma, parts = random_case("instrument", seed)
        tau = estimator.limit(sigma, parts)
        noise = {parts.x: 1.0, parts.y: 0.5, parts.z[0]: 2.0}
        bound, singles = bias_of(estimator, sigma, parts, noise, tau)
        assert bound == pytest.approx(0, abs=1e-9)
        assert set(singles) == {parts.x, parts.z[0]}
        if parts.w:
            touched += bias_of(estimator, sigma, parts, {parts.w[0]: 1.0}, tau)[0] > 0.01
    assert touched > 5


def test_noise_in_a_mediator_shrinks_the_mechanism() -> None:
    """x → m → y with m read at 0.7: β/τ = s_mm.x / (s_mm.x + e); here 0.75/(0.75 + 3/7)."""
    sigma = covariance(
        LinearModel(
            names=("x", "m", "y"),
            coefficients={"x": {}, "m": {"x": 0.5}, "y": {"m": 0.6}},
            effect=0.3,
        )
    )
    parts, noise = Parts(x=0, y=2, w=(), m=(1,)), {1: 1 / 0.7 - 1}
    bound, _ = bias_of(ROUTES["mechanism"].precision, sigma, parts, noise, 0.3)
    assert bound == pytest.approx(1 - 0.75 / (0.75 + 3 / 7))


# ------------------------------------------------------------------------------------------- size


def test_a_ceiling_forgives_a_rounding_error() -> None:
    numbers = [0.0, 230.0, 230 * (1 + 9e-10), 230 * (1 + 2e-9), 230.1, 1e-12]
    assert [forgiving_ceil(number) for number in numbers] == [0, 230, 230, 231, 231, 1]


def test_what_is_kept_lies_between_nothing_and_all() -> None:
    pairs = [(0.2, 0.4), (-0.2, -0.4), (-0.2, 0.4), (0.5, 0.4), (0.0, 0.4)]
    assert [keep_of(*pair) for pair in pairs] == [0.5, 0.5, 0.0, 1.0, 0.0]


def demand(**changes: object) -> Demand:
    """A demand with τ = 0.5 and z = 1.96."""
    plain = Demand(sigma=np.eye(2), rows={"x": 0, "y": 1}, effect=0.5, z=1.96, reach=None)
    return replace(plain, **changes)


def test_half_width_power_and_coverage_worked_by_hand() -> None:
    """V = 4 on 103 records of 2 variables, design effect 1.44: se = √(1.44 · 4/100) = 0.24.

    β = 0.4 keeps 0.8: half-width 1.96 · 0.24/0.8, power Φ(0.4/0.24 − 1.96), and with
    b = −0.1/0.24 a coverage of Φ(1.96 + 0.41667) − Φ(−1.96 + 0.41667).
    """
    half_width, power, coverage = precision_of(
        Estimate(0.4, 4.0), demand(), 1.44, records=103, measured=2
    )
    assert half_width == pytest.approx(0.588)
    assert power == pytest.approx(0.38465, abs=5e-5)  # Φ(−0.29333)
    assert coverage == pytest.approx(0.99126 - 0.06140, abs=5e-5)


def test_an_estimate_of_the_wrong_sign_shows_nothing() -> None:
    """Power is that of a test for the right side, on which an estimate without effect errs α/2."""
    half_width, power, coverage = precision_of(
        Estimate(-0.1, 4.0), demand(), 1.0, records=103, measured=2
    )
    assert half_width == inf
    assert power == pytest.approx(0.025, abs=1e-4)
    assert coverage < 0.16


def at(
    said: Precision, wanted: Demand, effect: float, records: int, plan: Plan
) -> tuple[float, ...]:
    """Half-width, power and coverage of a plan on another number of records."""
    estimate = Estimate(said.limit, said.variance)
    return precision_of(estimate, wanted, effect, records=records, measured=len(plan.buy.measure))


@pytest.mark.parametrize("wish", ["power: 0.8", "power: 0.95, confidence: 0.9"])
@every_case
def test_records_are_just_enough_to_detect(
    case: str, wish: str, study_of: Callable[[str], Study]
) -> None:
    study, route = study_of(sized(case, f"{{detect: implied, {wish}}}")), route_of(case)
    plan, wanted = plan_of(study, route), demand_of(study, study.effects[0])
    records, said, power = plan.buy.bill.records, plan.precision, study.size.power
    assert said is not None
    assert wanted is not None
    assert wanted.z == pytest.approx(NORMAL.inv_cdf((1 + study.size.confidence) / 2))
    assert said.power >= power - 1e-9
    assert at(said, wanted, 1.0, records, plan) == (said.half_width, said.power, said.coverage)
    assert at(said, wanted, 1.0, records - 1, plan)[1] < power


@every_case
def test_records_are_just_enough_for_a_half_width(
    case: str, study_of: Callable[[str], Study]
) -> None:
    study, route = study_of(sized(case, "{half_width: 0.08}")), route_of(case)
    plan, wanted = plan_of(study, route), demand_of(study, study.effects[0])
    records, said = plan.buy.bill.records, plan.precision
    assert said is not None
    assert wanted is not None
    assert said.half_width <= 0.08 * (1 + 1e-9)
    assert at(said, wanted, 1.0, records - 1, plan)[0] > 0.08


def test_the_first_stage_raises_the_records(study_of: Callable[[str], Study]) -> None:
    """A half-width of 1 would be had for few records; z → x of 0.3 asks for F = 20.

    Per record F grows by 0.09/0.91: ⌈20 · 0.91/0.09⌉ = 203 records, and twice as many at F = 40.
    """
    text = sized("instrument", "{half_width: 1}").replace("z: 0.55", "z: 0.3").replace("w: 0.3", "")
    for floor, records in ((None, 203), (40, 405), (10, 102)):
        tolerance = "" if floor is None else f"tolerance: {{first_stage_F: {floor}}}\n"
        plan = plan_of(study_of(text + tolerance), "instrument")
        assert plan.buy.bill.records == records
        assert plan.precision is not None
        assert plan.precision.first_stage_f == pytest.approx(records * 0.09 / 0.91)
    without = plan_of(study_of(text + "tolerance: {first_stage_F: 0}\n"), "instrument")
    assert without.buy.bill.records < 60


def test_nine_in_ten_studies_see_the_customary_ten() -> None:
    """Why the floor is 20: at F = 20 for the population, 9 in 10 samples of 200 show more than 10."""
    rho2 = 20 / 220
    s = wishart(np.array([[1, sqrt(rho2)], [sqrt(rho2), 1]]), 199, seed=7)
    r2 = s[:, 0, 1] ** 2 / (s[:, 0, 0] * s[:, 1, 1])
    assert np.mean(r2 / (1 - r2) * 198 > 10) == pytest.approx(0.9, abs=0.03)


CLUSTERS = "{clusters: {holds: 20, icc: {treatment: 0.3, outcome: 0.05}}}"


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("design_effect: 1.5", dict.fromkeys(ROUTES, 1.5)),
        (
            "design_effect: {conditioning: 1.3, mechanism: 2}",
            {"conditioning": 1.3, "instrument": 1.0, "mechanism": 2.0},
        ),
        (f"design_effect: {CLUSTERS}", dict.fromkeys(ROUTES, 1 + 19 * 0.3 * 0.05)),
        (CLUSTERS[1:-1], dict.fromkeys(ROUTES, 1 + 19 * 0.3 * 0.05)),
    ],
    ids=["a number", "by route", "clusters", "clusters of their own"],
)
def test_a_design_effect_multiplies_the_records(
    written: str, expected: dict[str, float], study_of: Callable[[str], Study]
) -> None:
    """Records less degrees of freedom, and what the first stage asks for."""
    for case in ("conditioning", "instrument", "mechanism"):
        text = sized(case, "{detect: implied}")
        plain, clustered = (
            plan_of(study_of(text + more), case) for more in ("", f"fieldwork: {{{written}}}\n")
        )
        assert plain.precision is not None
        said = clustered.precision
        assert said is not None
        k = NORMAL.inv_cdf(0.975) + NORMAL.inv_cdf(0.8)
        core = expected[case] * said.variance * (k / said.limit) ** 2
        measured = len(clustered.buy.measure)
        records = clustered.buy.bill.records
        assert records == forgiving_ceil(core) + measured + 1
        assert said.power == pytest.approx(0.8, abs=0.005)
        if said.first_stage_f is not None:
            assert plain.precision.first_stage_f is not None
            per_record = plain.precision.first_stage_f / plain.buy.bill.records
            assert said.first_stage_f == pytest.approx(per_record * records / expected[case])


UNITS = """effect: {treatment: x, outcome: y}
size: SIZE
variables:
  x: {caused_by: {c: 0.3}, per_unit: 1, share: 0.2}
  y: {caused_by: {x: 0.2, c: 0.3}, per_unit: 1, sd: 8}
  c: {per_unit: 1, reliability: 0.8}
"""


def test_natural_units_scale_the_answer_and_nothing_else(study_of: Callable[[str], Study]) -> None:
    """A yes/no treatment with 20 % yes has an SD of 0.4: one SD per SD is 8/0.4 = 20 units per unit."""
    plain = plan_of(study_of(UNITS.replace("SIZE", "{half_width: 0.1}")), "conditioning")
    scaled = plan_of(study_of(UNITS.replace("SIZE", "{half_width: 2, in: units}")), "conditioning")
    assert plain.buy.bill.records == scaled.buy.bill.records
    one, other = plain.precision, scaled.precision
    assert one is not None
    assert other is not None
    assert other.effect == pytest.approx(20 * one.effect) == pytest.approx(4)
    assert other.limit == pytest.approx(20 * one.limit)
    assert other.half_width == pytest.approx(20 * one.half_width)
    assert other.variance == pytest.approx(400 * one.variance)
    same = ("bias_bound", "power", "coverage")
    assert [getattr(other, key) for key in same] == pytest.approx(
        [getattr(one, key) for key in same]
    )


def test_an_effect_to_detect_is_drawn_into_the_diagram(study_of: Callable[[str], Study]) -> None:
    """detect: 2 units is 0.1 SDs per SD: just as if x → y were 0.1; confounding stays as it is."""
    asked = plan_of(study_of(UNITS.replace("SIZE", "{detect: 2, in: units}")), "conditioning")
    drawn = UNITS.replace("x: 0.2, c", "x: 0.1, c").replace("SIZE", "{detect: implied, in: units}")
    same = plan_of(study_of(drawn), "conditioning")
    assert asked.buy.bill == same.buy.bill
    assert asked.precision == same.precision
    assert asked.precision is not None
    # The confounder at λ = 0.8 leaves 0.09 · 0.2/(1 − 0.8 · 0.09) SDs per SD, whatever the effect.
    left = 20 * 0.09 * 0.2 / (1 - 0.8 * 0.09)
    assert asked.precision.limit - asked.precision.effect == pytest.approx(left)


def test_confidence_widens_the_interval(study_of: Callable[[str], Study]) -> None:
    """99 % and 95 % on as many records: half-widths as 2.5758 to 1.9600."""
    widths = []
    for confidence in ("0.99", "0.95"):
        size = f"{{records: 300, confidence: {confidence}}}"
        said = plan_of(study_of(sized("conditioning", size)), "conditioning").precision
        assert said is not None
        assert said.coverage == pytest.approx(float(confidence))
        widths.append(said.half_width)
    assert widths[0] / widths[1] == pytest.approx(2.575829 / 1.959964)

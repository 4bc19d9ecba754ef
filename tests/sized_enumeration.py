"""The cheapest study at a stated precision by trying everything, apart from the packages.

The yardstick of the joint search. Like ``enumeration``, with whose criteria and bills it works, it
starts from the plain values of a study file. Covariances come from the whole linear model at once;
estimates from precision matrices, where the packages have partial covariances:

    Σ = (I − B)⁻¹ D (I − B)⁻ᵀ; given S, the inverse of what Σ⁻¹ holds of the others
    with K the inverse covariance of Y, X and Z:   s_yy.xZ = 1/K_yy,   β = −K_xy/K_yy,
                                                   s_xx.Z = 1/(K_xx − K_xy²/K_yy)

Every set of covariates among what does not follow from the treatment is tried, every instrument,
every set of mediators, and every way of reading each of them, all ways of one set at a time.
"""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from math import ceil, inf
from statistics import NormalDist
from typing import Any

import networkx as nx
import numpy as np

from tests.enumeration import Bills, Criteria, graph_of, subsets

MOST_RECORDS = 1e9
FORGIVEN = 1e-9
WORDS = {"weak": 0.1, "moderate": 0.3, "strong": 0.5}
USUAL_F = 20


# ------------------------------------------------------------------------------------ linear model


class Model:
    """What the strengths of a study say: covariances given S, and the effect."""

    def __init__(self, study: dict[str, Any]) -> None:
        x, y = study["effect"]["treatment"], study["effect"]["outcome"]
        size = study["size"]
        self.scale = natural(study["variables"][y]) / natural(study["variables"][x])
        if size.get("in") != "units":
            self.scale = 1.0
        arrows = arrows_of(study)
        self.effect = effect_of(arrows, x, y)
        if self.effect and isinstance(size.get("detect"), int | float):
            factor = size["detect"] / self.scale / abs(self.effect)
            after = nx.descendants(graph_of(study), x) | {x}
            arrows[y] = {c: b * factor if c in after else b for c, b in arrows[y].items()}
            self.effect = effect_of(arrows, x, y)
        sigma = covariance_of(arrows)
        names = list(arrows)
        selected = set(study.get("selected_by", []))
        left = [row for row, name in enumerate(names) if name not in selected]
        self.sigma = np.linalg.inv(np.linalg.inv(sigma)[np.ix_(left, left)])
        self.rows = {names[row]: place for place, row in enumerate(left)}

    def block(self, names: Iterable[str]) -> np.ndarray:
        """True covariances of some variables."""
        rows = [self.rows[name] for name in names]
        return self.sigma[np.ix_(rows, rows)]


def natural(variable: dict[str, Any]) -> float:
    """The standard deviation of a variable."""
    if "share" in variable:
        return (variable["share"] * (1 - variable["share"])) ** 0.5
    return variable.get("sd", 1.0)


def arrows_of(study: dict[str, Any]) -> dict[str, dict[str, float]]:
    """The coefficients into each variable, causes first; only what all strengths are known of."""
    default = study.get("default_strength")

    def number(strength: Any) -> float | None:
        strength = default if strength is None else strength
        if isinstance(strength, str):
            return WORDS[strength.lstrip("-")] * (-1 if strength.startswith("-") else 1)
        return strength

    arrows: dict[str, dict[str, Any]] = {}
    for name, variable in study["variables"].items():
        causes = variable.get("caused_by", {})
        given = causes.items() if isinstance(causes, dict) else ((cause, None) for cause in causes)
        arrows[name] = {cause: number(strength) for cause, strength in given}
    for place, each in enumerate(study.get("hidden_common_causes", [])):
        hidden = f"hidden {place}"
        arrows[hidden] = {}
        if isinstance(each, dict):
            root = abs(each["strength"]) ** 0.5
            loads = [root, root if each["strength"] >= 0 else -root]
            pair = each["of"]
        else:
            loads, pair = [number(None)] * 2, each
        for name, load in zip(pair, loads, strict=True):
            arrows[name][hidden] = load
    graph = nx.DiGraph([(c, name) for name, into in arrows.items() for c in into])
    graph.add_nodes_from(arrows)
    known: dict[str, dict[str, float]] = {}
    for name in nx.lexicographical_topological_sort(graph):
        if all(b is not None and cause in known for cause, b in arrows[name].items()):
            known[name] = arrows[name]
    return known


def drawn(arrows: Mapping[str, Mapping[str, float]]) -> np.ndarray:
    """B: the coefficient of the column in the row."""
    at = {name: row for row, name in enumerate(arrows)}
    b = np.zeros((len(at), len(at)))
    for name, into in arrows.items():
        for cause, strength in into.items():
            b[at[name], at[cause]] = strength
    return b


def covariance_of(arrows: Mapping[str, Mapping[str, float]]) -> np.ndarray:
    """Σ = (I − B)⁻¹ D (I − B)⁻ᵀ, with the noise D that gives every variable variance 1."""
    b = drawn(arrows)
    whole = np.linalg.inv(np.eye(len(b)) - b)
    noise = np.zeros(len(b))
    for row in range(len(b)):
        noise[row] = 1.0 - whole[row, :row] ** 2 @ noise[:row]
    assert noise.min() > 0, "no variable is explained in full"
    return whole @ np.diag(noise) @ whole.T


def effect_of(arrows: Mapping[str, Mapping[str, float]], x: str, y: str) -> float:
    """τ, the entry of (I − B)⁻¹."""
    names = list(arrows)
    whole = np.linalg.inv(np.eye(len(names)) - drawn(arrows))
    return float(whole[names.index(y), names.index(x)])


# --------------------------------------------------------------------------------------- estimates


@dataclass(frozen=True)
class Roles:
    """Who plays which part besides treatment and outcome."""

    covariates: tuple[str, ...] = ()
    instrument: tuple[str, ...] = ()
    mediators: tuple[str, ...] = ()

    @property
    def names(self) -> list[str]:
        """All that are measured for it."""
        return sorted((*self.covariates, *self.instrument, *self.mediators))


Noise = Mapping[str, np.ndarray]
"""Error variances by variable, a case of its own in each entry."""


def inverse(model: Model, names: list[str], noise: Noise) -> np.ndarray:
    """The inverse covariances of what is read, one matrix a case."""
    errors = np.stack([noise[name] for name in names], axis=-1)
    return np.linalg.inv(model.block(names) + errors[..., None] * np.eye(len(names)))


def regression(k: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Of Y (first) on X (second) and the rest: β, s_yy given all, 1/s_xx given all but Y."""
    beta = -k[..., 0, 1] / k[..., 0, 0]
    return beta, 1 / k[..., 0, 0], k[..., 1, 1] - k[..., 0, 1] ** 2 / k[..., 0, 0]


def estimate(
    model: Model, x: str, y: str, roles: Roles, noise: Noise
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """β, V and the first-stage F per record (∞ where there is no first stage)."""
    covariates = list(roles.covariates)
    beta, left, inverse_spread = regression(inverse(model, [y, x, *covariates], noise))
    if roles.mediators:
        beyond, both, steady = regression(
            inverse(model, [y, x, *roles.mediators, *covariates], noise)
        )
        variance = (left - 2 * both) * inverse_spread + both * steady
        return beta - beyond, variance, np.full_like(beta, inf)
    if roles.instrument:
        return by_instrument(model, x, y, roles, noise)
    return beta, left * inverse_spread, np.full_like(beta, inf)


def by_instrument(
    model: Model, x: str, y: str, roles: Roles, noise: Noise
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The instrumental regression: A γ = Cov((z, W), Y), A = Cov((z, W), (X, W)), and its sandwich.

    With e what is left of Y, C the covariance of (z, W): V is the first entry of s_ee A⁻¹ C A⁻ᵀ.
    """
    covariates = list(roles.covariates)
    names = [*roles.instrument, *covariates, x, y]
    errors = np.stack([noise[name] for name in names], axis=-1)
    read = model.block(names) + errors[..., None] * np.eye(len(names))
    first = list(range(len(covariates) + 1))
    x_at, y_at = len(first), len(first) + 1
    second = [x_at, *first[1:]]
    a = read[..., first, :][..., second]
    c = read[..., first, :][..., first]
    gamma = np.linalg.solve(a, read[..., first, y_at][..., None])[..., 0]
    contrast = np.concatenate([np.ones((*gamma.shape[:-1], 1)), -gamma], axis=-1)
    rows = [y_at, *second]
    within = read[..., rows, :][..., rows]
    s_ee = np.einsum("...i,...ij,...j->...", contrast, within, contrast)
    top = np.linalg.inv(a)[..., 0, :]
    variance = s_ee * np.einsum("...i,...ij,...j->...", top, c, top)
    k = inverse(model, [x, *roles.instrument, *covariates], noise)
    share = k[..., 0, 1] ** 2 / (k[..., 0, 0] * k[..., 1, 1])
    return gamma[..., 0], variance, share / (1 - share)


# ------------------------------------------------------------------------------------- everything


@dataclass(frozen=True, kw_only=True)
class Study:
    """One study that could be done."""

    total: Fraction
    started: int
    records: int
    measure: dict[str, str]
    roles: Roles
    ranks: tuple[int, ...]
    bias: float
    f_per_record: float
    core: float
    """design effect · V / keep²."""
    minutes: Fraction
    reliability: Fraction

    @property
    def key(self) -> tuple[Any, ...]:
        """What decides between two studies."""
        roles = self.roles
        names = sorted(self.measure)
        return self.total, len(names), names, self.ranks, roles.instrument, roles.mediators


@dataclass(frozen=True)
class Drafts:
    """All ways of reading for all roles of one route, an entry each."""

    roles: list[Roles]
    """For each number in ``who``."""
    who: np.ndarray
    ranks: list[np.ndarray]
    """For each of the roles, the ranks of the ways of (x, y, others by name), a row each."""
    first: np.ndarray
    """For each of the roles, the entry at which it begins."""
    core: np.ndarray
    strength: np.ndarray
    bias: np.ndarray
    measured: np.ndarray
    bought: np.ndarray
    """Whether each purchase is bought."""
    reliability: np.ndarray


class SizedEnumeration:
    """All answers to one study."""

    def __init__(self, study: dict[str, Any]) -> None:
        self.study = study
        self.size = study["size"]
        self.x, self.y = study["effect"]["treatment"], study["effect"]["outcome"]
        self.selected = set(study.get("selected_by", []))
        self.bills = Bills(study)
        self.measurable = {name for name in study["variables"] if self.bills.ways(name)}
        self.criteria = Criteria(graph_of(study), self.x, self.y, self.selected)
        self.model = Model(study)
        self.tolerance = study.get("tolerance", {})
        self.known: dict[str, Drafts] = {}
        self.priced: dict[tuple[Any, ...], tuple[Fraction, int]] = {}

    # ---------------------------------------------------------------------------------- validity

    def roles_of(self, route: str) -> Iterator[Roles]:
        """All roles that open a route."""
        criteria = self.criteria
        if self.y not in criteria.after or self.selected & criteria.after:
            return
        before = self.measurable - criteria.after - self.selected
        for covariates in subsets(before):
            some = set(covariates)
            if route == "conditioning" and criteria.conditioning(some):
                yield Roles(covariates)
            if route == "instrument":
                for z in sorted(before - some):
                    if criteria.instrument(z, some):
                        yield Roles(covariates, (z,))
            if route == "mechanism":
                for mediators in subsets((self.measurable & criteria.causal) - {self.y}):
                    if criteria.mechanism(set(mediators), some):
                        yield Roles(covariates, (), mediators)

    # ------------------------------------------------------------------------------------ drafts

    @cached_property
    def ranked(self) -> dict[str, list[str]]:
        """The ways of each variable: better readings first, then smaller names."""
        found = {}
        for name in self.measurable:
            ways = self.bills.ways(name)
            found[name] = sorted(ways, key=lambda w, ways=ways: (-reliability(ways[w]), w))
        return found

    @cached_property
    def errors(self) -> dict[str, np.ndarray]:
        """The error variance of each of them."""
        return {
            name: np.array([float(1 / reliability(self.bills.ways(name)[way]) - 1) for way in ways])
            for name, ways in self.ranked.items()
        }

    @cached_property
    def purchases(self) -> list[tuple[Any, dict[str, Any]]]:
        """Everything that can be bought, with its name."""
        ways = [
            ((n, w), self.bills.ways(n)[w]) for n in sorted(self.ranked) for w in self.ranked[n]
        ]
        return [*self.bills.components.items(), *ways]

    def brought(self, name: str, rank: int) -> np.ndarray:
        """Whether each purchase comes with a way."""
        way = self.ranked[name][rank]
        needs = self.bills.needs(self.bills.ways(name)[way]) | {(name, way)}
        return np.array([each in needs for each, _ in self.purchases])

    @cached_property
    def always(self) -> np.ndarray:
        """Whether each purchase is bought in any case."""
        names = {name for name, each in self.bills.components.items() if each.get("always")}
        names |= {n for name in names for n in self.bills.needs(self.bills.components[name])}
        return np.array([name in names for name, _ in self.purchases])

    @property
    def design_effect(self) -> Any:
        """As the study gives it."""
        fieldwork = self.study.get("fieldwork", {})
        clusters = fieldwork.get("clusters")
        if clusters:
            icc = clusters["icc"]
            return 1 + (clusters["holds"] - 1) * icc["treatment"] * icc["outcome"]
        return fieldwork.get("design_effect", 1)

    def design_effect_of(self, route: str) -> float:
        """By what records are multiplied."""
        given = self.design_effect
        return float(given.get(route, 1) if isinstance(given, dict) else given)

    def drafts(self, route: str) -> Drafts:
        """Everything that could be done on a route."""
        if route not in self.known:
            self.known[route] = self._drafts(route)
        return self.known[route]

    def _drafts(self, route: str) -> Drafts:
        every = list(self.roles_of(route))
        design_effect, effect = self.design_effect_of(route), self.model.effect
        ranks, who = [], []
        parts: dict[str, list[np.ndarray]] = {
            key: [] for key in ("core", "strength", "bias", "measured", "bought", "reliability")
        }
        for number, roles in enumerate(every):
            names = [self.x, self.y, *roles.names]
            shape = [len(self.ranked[name]) for name in names]
            combos = np.indices(shape).reshape(len(names), -1).T
            noise = {n: self.errors[n][combos[:, at]] for at, n in enumerate(names)}
            beta, variance, strength = estimate(self.model, self.x, self.y, roles, noise)
            keep = np.clip(beta / effect, 0, 1)
            keep[keep < 1e-9] = 0
            with np.errstate(divide="ignore"):
                core = design_effect * variance / keep**2
            bought = np.tile(self.always, (len(combos), 1))
            least = np.ones(len(combos))
            for at, name in enumerate(names):
                brought = np.array([self.brought(name, rank) for rank in range(shape[at])])
                bought |= brought[combos[:, at]]
                reads = [float(reliability(self.bills.ways(name)[w])) for w in self.ranked[name]]
                least = np.minimum(least, np.array(reads)[combos[:, at]])
            ranks.append(combos)
            who.append(np.full(len(combos), number))
            parts["core"].append(core)
            parts["strength"].append(strength)
            parts["bias"].append(self.bias(roles, names, combos))
            parts["measured"].append(np.full(len(combos), len(names)))
            parts["bought"].append(bought)
            parts["reliability"].append(least)
        sizes = [0, *(len(each) for each in ranks)]
        joined = {key: np.concatenate(each) if each else np.empty(0) for key, each in parts.items()}
        return Drafts(
            every,
            np.concatenate(who) if who else np.empty(0, int),
            ranks,
            np.cumsum(sizes),
            **joined,
        )

    def bias(self, roles: Roles, names: list[str], combos: np.ndarray) -> np.ndarray:
        """The bias bound: every reading alone, and what all of them do together beyond that."""
        effect, x, y = self.model.effect, self.x, self.y
        none = {name: np.zeros(1) for name in names}
        signed, size = np.zeros(len(combos)), np.zeros(len(combos))
        for at, name in enumerate(names):
            if name == y:
                continue
            errors = self.errors[name]
            alone = {n: np.zeros(len(errors)) for n in none} | {name: errors}
            missed = estimate(self.model, x, y, roles, alone)[0] - effect
            missed = np.where(errors > 0, missed, 0)
            signed += missed[combos[:, at]]
            size += np.abs(missed)[combos[:, at]]
        noise = {n: self.errors[n][combos[:, at]] for at, n in enumerate(names)}
        noise[y] = np.zeros(len(combos))
        together = estimate(self.model, x, y, roles, noise)[0] - effect
        return (size + np.abs(together - signed)) / abs(effect)

    # ------------------------------------------------------------------------------------- money

    @cached_property
    def tariff(self) -> dict[str, np.ndarray]:
        """Prices as floating-point numbers."""
        entries = [entry for _, entry in self.purchases]
        burdens = self.study.get("burdens", {})

        def running(entry: dict[str, Any]) -> float:
            taken = entry.get("takes", {}).items()
            return number(entry, "per_unit") + sum(
                float(burdens[name].get("price", 0)) * float(amount) for name, amount in taken
            )

        def reach(entry: dict[str, Any]) -> float:
            needs = self.bills.needs(entry)
            return float(np.prod([number(self.bills.components[n], "yields", 1) for n in needs]))

        return {
            "setup": np.array([number(each, "setup") for each in entries]),
            "running": np.array([running(each) for each in entries]),
            "reach": np.array([reach(each) for each in entries]),
            "yields": np.array([number(each, "yields", 1) for each in entries]),
            "batch": np.array([float(e["batch"]["price"]) if "batch" in e else 0 for e in entries]),
            "holds": np.array([float(e["batch"]["holds"]) if "batch" in e else 1 for e in entries]),
            "minutes": np.array([number(each.get("takes", {}), "minutes") for each in entries]),
        }

    def roughly(self, bought: np.ndarray, records: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Totals and units started, never above the exact ones."""
        tariff, less = self.tariff, 1 - 1e-9
        kept = np.where(bought, tariff["yields"], 1).prod(axis=1) * float(self.bills.usable)
        started = np.ceil(records / kept * less)
        counts = np.ceil(started[:, None] * tariff["reach"] * less)
        lines = tariff["setup"] + tariff["running"] * counts
        lines = lines + tariff["batch"] * np.ceil(counts / tariff["holds"] * less)
        totals = np.where(bought, lines, 0).sum(axis=1) * float(self.bills.surcharge)
        return totals * (1 - 1e-12), started

    def exactly(self, drafts: Drafts, at: int, records: int) -> Study:
        """One study, priced in fractions."""
        roles = drafts.roles[drafts.who[at]]
        names = [self.x, self.y, *roles.names]
        ranks = drafts.ranks[drafts.who[at]][at - drafts.first[drafts.who[at]]]
        rank = dict(zip(names, map(int, ranks), strict=True))
        measure = {name: self.ranked[name][rank[name]] for name in names}
        key = (tuple(sorted(measure.items())), records)
        if key not in self.priced:
            self.priced[key] = self.bills.priced(measure, records)
        total, started = self.priced[key]
        ways = [self.bills.ways(name)[way] for name, way in measure.items()]
        return Study(
            total=total,
            started=started,
            records=records,
            measure=measure,
            roles=roles,
            ranks=tuple(rank[name] for name in sorted(names)),
            bias=float(drafts.bias[at]),
            f_per_record=float(drafts.strength[at]),
            core=float(drafts.core[at]),
            minutes=self.bills.minutes(measure),
            reliability=min(map(reliability, ways)),
        )

    # ------------------------------------------------------------------------------------ limits

    def limits(self, route: str) -> dict[str, Any]:
        """Every limit on a route."""
        spend = self.size.get("spend")
        budgets = [b for b in (self.study.get("budget"), spend) if b is not None]
        limits = {
            "budget": min(budgets, default=None),
            "frame_size": self.study.get("fieldwork", {}).get("frame_size"),
            "least_reliability": self.tolerance.get("least_reliability"),
            "bias": self.tolerance.get("bias"),
            "first_stage_F": self.tolerance.get("first_stage_F", USUAL_F)
            if route == "instrument"
            else None,
            "records": self.size.get("records"),
            "burdens.minutes": self.study.get("burdens", {}).get("minutes", {}).get("limit"),
        }
        return {name: limit for name, limit in limits.items() if limit is not None}

    @property
    def reach(self) -> float | None:
        """K; None where the number of records, or the money, is given."""
        z = NormalDist().inv_cdf((1 + self.size.get("confidence", 0.95)) / 2)
        if "half_width" in self.size:
            return z * self.model.scale / self.size["half_width"]
        if "detect" in self.size:
            power = NormalDist().inv_cdf(self.size.get("power", 0.8))
            return (z + power) / abs(self.model.effect)
        return None

    def records_needed(self, route: str, drafts: Drafts, limits: dict[str, Any]) -> np.ndarray:
        """The records of every study; ∞ where none will do."""
        if "records" in limits:
            needed = np.full(len(drafts.core), float(limits["records"]))
            needed[needed <= drafts.measured + 1] = inf
        else:
            # Where nothing else says how many: one more than degrees of freedom take, and no fewer
            # than the study asks for.
            core = np.where(drafts.core < inf, 1.0, inf)
            if self.reach is not None:
                core = np.ceil(drafts.core * self.reach**2 * (1 - FORGIVEN))
            needed = np.maximum(core + drafts.measured + 1, self.size.get("records", 0))
        floor = float(limits.get("first_stage_F", 0))
        if floor:
            with np.errstate(divide="ignore"):
                least = floor * self.design_effect_of(route) / drafts.strength
            least = np.where(drafts.strength < inf, np.ceil(least * (1 - FORGIVEN)), 0)
            short = least > needed
            needed = np.where(short, inf if "records" in limits else least, needed)
        needed[needed > MOST_RECORDS] = inf
        return needed

    def within(self, drafts: Drafts, limits: dict[str, Any]) -> np.ndarray:
        """Which studies keep all limits but those that hang on the number of records."""
        good = drafts.reliability >= float(limits.get("least_reliability", 0)) - 1e-12
        good &= drafts.bias <= float(limits.get("bias", inf)) * (1 + FORGIVEN)
        minutes = (drafts.bought * self.tariff["minutes"]).sum(axis=1)
        return good & (minutes <= float(limits.get("burdens.minutes", inf)) + 1e-9)

    def best(self, route: str, limits: dict[str, Any]) -> Study | None:
        """The cheapest study on a route within limits."""
        drafts = self.drafts(route)
        if not len(drafts.core):
            return None
        needed = self.records_needed(route, drafts, limits)
        some = np.flatnonzero(self.within(drafts, limits) & (needed < inf))
        totals, started = self.roughly(drafts.bought[some], needed[some])
        good = started <= limits.get("frame_size", inf)
        good &= totals <= float(limits.get("budget", inf))
        some, totals = some[good], totals[good]
        best: Study | None = None
        for place in np.lexsort((drafts.measured[some], totals)):
            at = int(some[place])
            if best is not None and totals[place] > float(best.total):
                break
            is_dearer = best is not None and totals[place] * (1 + 2e-12) >= float(best.total)
            if is_dearer and drafts.measured[at] > len(best.measure):
                continue
            study = self.exactly(drafts, at, int(needed[at]))
            if study.started > limits.get("frame_size", inf):
                continue
            if study.total > Fraction(str(limits.get("budget", study.total))):
                continue
            best = study if best is None or study.key < best.key else best
        return best

    def half_width(self, study: Study) -> float:
        """Of the interval around what a study estimates, in the units of the answer."""
        z = NormalDist().inv_cdf((1 + self.size.get("confidence", 0.95)) / 2) * self.model.scale
        return float(z * (study.core / (study.records - len(study.measure) - 1)) ** 0.5)

    def records_by_precision(self, study: Study) -> int:
        """The records that a study needs at its target, whatever its first stage is."""
        assert self.reach is not None, "there is a target"
        core = ceil(study.core * self.reach**2 * (1 - FORGIVEN))
        return core + len(study.measure) + 1

    # ------------------------------------------------------------------------------- money given

    def scores(self, route: str, limits: dict[str, Any]) -> tuple[np.ndarray, np.ndarray]:
        """Of every draft whether it keeps all limits, and its money, never above the exact sum.

        Where money is given, the squared half-width that it buys (over z²), never above the exact.
        """
        drafts = self.drafts(route)
        if "spend" in self.size:
            records, scores = self.affordable(drafts, limits)
            floor = float(limits.get("first_stage_F", 0)) * self.design_effect_of(route)
            good = self.within(drafts, limits) & (scores < inf)
            with np.errstate(invalid="ignore"):
                reached = np.where(drafts.strength < inf, records * drafts.strength, inf)
            return good & (reached >= floor * (1 - FORGIVEN)), scores
        needed = self.records_needed(route, drafts, limits)
        totals, started = self.roughly(drafts.bought, np.where(needed < inf, needed, 1))
        good = self.within(drafts, limits) & (needed < inf)
        good &= started <= limits.get("frame_size", inf)
        return good & (totals <= float(limits.get("budget", inf))), totals

    def affordable(self, drafts: Drafts, limits: dict[str, Any]) -> tuple[np.ndarray, np.ndarray]:
        """The most records that the money buys, never too few, and core / (n − measured − 1)."""
        money, frame = float(limits["budget"]), limits.get("frame_size", inf)
        low, high = np.zeros(len(drafts.core)), np.full(len(drafts.core), 2.0**31)
        while np.any(high - low > 1):
            middle = np.floor((low + high) / 2)
            totals, started = self.roughly(drafts.bought, middle)
            fits = (totals <= money) & (started <= frame)
            low, high = np.where(fits, middle, low), np.where(fits, high, middle)
        low = np.minimum(low, MOST_RECORDS)
        spare = low - drafts.measured - 1
        return low, np.where(spare > 0, drafts.core / np.maximum(spare, 1), inf)

    def narrowest(self, route: str, limits: dict[str, Any]) -> tuple[float, Study] | None:
        """The smallest half-width that the money buys, and a study that has it."""
        drafts = self.drafts(route)
        if not len(drafts.core):
            return None
        most, scores = self.affordable(drafts, limits)
        scores = np.where(self.within(drafts, limits), scores, inf)
        floor = float(limits.get("first_stage_F", 0)) * self.design_effect_of(route)
        best: tuple[float, Study] | None = None
        for at in map(int, np.argsort(scores, kind="stable")):
            if scores[at] == inf or (best is not None and scores[at] >= best[0]):
                break
            study = self.most_bought(drafts, at, int(most[at]), limits)
            if study is None:
                continue
            if study.records * study.f_per_record < floor * (1 - FORGIVEN):
                continue
            score = study.core / (study.records - len(study.measure) - 1)
            best = (score, study) if best is None or score < best[0] else best
        return None if best is None else (self.half_width(best[1]), best[1])

    def most_bought(
        self, drafts: Drafts, at: int, records: int, limits: dict[str, Any]
    ) -> Study | None:
        """One study on the most records that the money buys, exactly."""
        budget, frame = Fraction(str(limits["budget"])), limits.get("frame_size", inf)
        for fewer in range(records, int(drafts.measured[at]) + 1, -1):
            study = self.exactly(drafts, at, fewer)
            if study.total <= budget and study.started <= frame:
                return study
        return None


def reliability(way: dict[str, Any]) -> Fraction:
    """Of a way, exactly."""
    return Fraction(str(way.get("reliability", 1)))


def number(entry: dict[str, Any], key: str, default: float = 0) -> float:
    """A number of an entry."""
    return float(entry.get(key, default))

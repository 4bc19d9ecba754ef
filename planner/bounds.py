"""Bounds on precision that hold for every plan below a node of the search: what a node knows.

The routes' ``bounds.py`` turn a ``Sight`` into a ``Floor``, with the facts of ``planner.ranges``.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from math import inf, sqrt

import numpy as np
from numpy.typing import NDArray

from planner.precision import Matrix, Parts, partial
from planner.ranges import TINY, Blocks, Vector, ranged, slope_range

__all__ = [
    "Basis",
    "Floor",
    "Shifts",
    "Sight",
    "View",
    "one_noisy",
    "summed",
    "with_rest",
]

CLOSED = 1e-9
"""A correlation below this is none."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Floor:
    """What no plan below a node can do better.

    V / keep² ≥ max(alpha + gamma · N, kappa · √N),    N ≥ least + Σ_j increments[j, option_j]
    """

    least: float
    """The outcome's variance that is left with everything undecided read at its best."""
    increments: Matrix
    """For each undecided covariate what each option adds to it; first that it is left out."""
    alpha: float = 0.0
    gamma: float = 0.0
    kappa: float = 0.0
    strongest: float | None = None
    """For an instrument, the most that its first-stage F can be per record."""
    bias: float = 0.0
    """The bias bound is no less, whatever R adds."""
    decided_bias: float = 0.0
    """What decided readings alone add to it."""
    more_bias: Matrix | None = None
    """What each option of R alone adds; None where bias is of no interest."""
    is_dead: bool = False
    """No plan below keeps anything of the effect."""
    related: Vector
    """For each of R the share of the treatment's variance (or of whatever else widens the ranges)
    that it takes out: what taking it in costs in precision, and what deciding on it tells."""
    closing: Vector | None = None
    """How far each of R helps to close what I leaves open; None where it leaves nothing open."""

    def variance(self, left: float) -> float:
        """Return the bound on V / keep² where so much of the outcome's variance is left."""
        return max(self.alpha + self.gamma * left, self.kappa * sqrt(left))


@dataclass(frozen=True, kw_only=True, slots=True)
class Sight:
    """What is known at a node: who plays which part, read in which way, and who is undecided."""

    sigma: Matrix
    """True covariances, given S."""
    effect: float
    parts: Parts
    """Decided parts; undecided mediators are not among them."""
    noise: dict[int, float]
    """Error variance of what is decided, and of undecided mediators at their best."""
    undecided: tuple[int, ...]
    """R, rows."""
    best: Vector
    """Error variance of R, each in its best way."""
    worse: Matrix
    """What each option adds to it, ∞ for leaving it out; left out first, then the ways."""
    forced: frozenset[int] = frozenset()
    """Members of R that no valid set can do without."""
    open_mediators: tuple[int, ...] = ()
    with_bias: bool = False
    """Whether a bound on bias is of use."""

    @property
    def ends(self) -> tuple[int, ...]:
        """Treatment, outcome, instrument and mediators: the first rows of a view."""
        return (self.parts.x, self.parts.y, *self.parts.z, *self.parts.m)

    def as_read(self) -> "View":
        """Return covariances given I as read, and whoever is forced in the worst way.

        A better reading of somebody forced is that one and a second, independent one: the inverses
        of their error variances add up. The second reading takes the place among R.
        """
        forced = np.array([row in self.forced for row in self.undecided], dtype=bool)
        errors, worse = self.best.copy(), self.worse.copy()
        noise = dict(self.noise)
        for at in np.flatnonzero(forced).tolist():
            ways = self.best[at] + self.worse[at, 1:]
            ways = ways[ways < inf]
            noise[self.undecided[at]] = float(ways.max())
            second = np.array([apart(each, ways.max()) for each in ways])
            errors[at] = second.min()
            worse[at, 1 : len(ways) + 1] = second - second.min() if second.min() < inf else inf
        held = [*self.parts.w, *np.array(self.undecided, dtype=int)[forced].tolist()]
        rows = [*self.ends, *self.open_mediators, *self.undecided]
        across = self.sigma[np.ix_(rows, held)]
        block = self.sigma[np.ix_(held, held)] + np.diag([noise[row] for row in held])
        s = self.sigma[np.ix_(rows, rows)] - across @ np.linalg.solve(block, across.T)
        first = len(rows) - len(self.undecided)
        for place, row in enumerate(rows[:first]):
            s[place, place] += noise[row]
        # Whoever is forced and has only one way adds nothing more.
        for place in (first + np.flatnonzero(errors == inf)).tolist():
            s[place, :] = s[:, place] = 0
        errors[errors == inf] = 1.0
        return View(s=s[None], base=s, errors=errors, first=first, worse=worse)


def apart(better: float, worse: float) -> float:
    """Return the error variance of a second reading that makes a worse one as good as a better."""
    if better >= worse:
        return inf
    return 1 / (1 / better - 1 / worse) if better else 0.0


@dataclass(frozen=True, kw_only=True)
class View:
    """Covariances of the same variables in several cases, and what R can take out of them.

    The ends come first (x, y, then z or the mediators), then R.
    """

    s: Matrix
    """Cases × variables × variables."""
    base: Matrix
    """Covariances whose part on R is no larger than that of any case (as a matrix)."""
    errors: Vector
    """Error variances of R that come on top of it."""
    first: int
    """Where R begins."""
    worse: Matrix = field(default_factory=lambda: np.zeros((0, 1)))
    """What each option of R adds to the errors, where that is of interest."""

    def given(self, place: int) -> "View":
        """Return the same given one more variable."""
        across = self.s[:, :, place]
        out: Matrix = across[:, :, None] * across[:, None, :] / across[:, place, None, None]
        return replace(self, s=np.asarray(self.s - out), base=partial(self.base, [place]))

    @cached_property
    def inverse(self) -> Matrix:
        """A⁻¹, or anything larger, for every case."""
        block = self.base[self.first :, self.first :]
        return np.asarray(np.linalg.inv(block + np.diag(self.errors)), dtype=np.float64)

    @cached_property
    def blocks(self) -> "Blocks":
        """Parts of R that have nothing to do with each other."""
        block = self.base[self.first :, self.first :]
        changed = np.abs(self.s[:, self.first :, self.first :] - block).sum(axis=2) > TINY
        return Blocks.of(block, changed.T)

    def joined(self, x: int, y: int, slope: float) -> Vector:
        """Return how far each of R may move the slope of y on x, as a share of it (first case).

        Whoever is related to both ends does, to x and to what the slope leaves of y.
        """
        left = self.on(y)[:, 0] - slope * self.on(x)[:, 0]
        size = np.diagonal(self.s[0])[self.first :] + TINY
        found = np.abs(self.on(x)[:, 0] * left) / size
        return np.asarray(found / (abs(slope) * self.of(x, x)[0] + TINY))

    def taken(self, u: Matrix, v: Matrix) -> tuple[Vector, Vector]:
        """Return between which numbers what R takes out of a covariance lies, in each case."""
        return ranged(self.inverse, u, v, self.blocks)

    def of(self, one: int, other: int) -> Vector:
        """Return the covariance of two of the ends in each case."""
        return self.s[:, one, other]

    def on(self, one: int) -> Matrix:
        """Return the covariances of R with one of the ends; a column for each case."""
        return self.s[:, self.first :, one].T

    def shares(self, place: int) -> Vector:
        """Return what share of the variance of one of the ends each of R takes out by itself."""
        variances = np.diagonal(self.s[0])[self.first :] * self.of(place, place)[0]
        with np.errstate(invalid="ignore", divide="ignore"):
            found: Vector = self.on(place)[:, 0] ** 2 / variances
        return np.nan_to_num(found, nan=0.0, posinf=0.0)

    def slope(self, x: int, y: int) -> tuple[Vector, Vector]:
        """Return between which numbers the coefficient of x in the regression of y lies."""
        return slope_range(
            self.inverse, self.on(x), self.on(y), self.of(x, x), self.of(x, y), self.blocks
        )

    def beside(self, x: int, y: int, error: float, c: float) -> tuple[Vector, Vector]:
        """Return between which numbers s_xr lies, with r = y − cx and x without its errors."""
        u = self.on(x)
        low, high = self.taken(u, self.on(y) - c * u)
        left = self.of(x, y) - c * (self.of(x, x) - error)
        return left - high, left - low

    def slope_with_errors(
        self, x: int, y: int, error: float, reference: float
    ) -> tuple[Vector, Vector]:
        """Return the same where part of the variance of x is error: a narrower range.

        With s the variance of x without errors given W, and y = cx + r for any number c,

            β = c · s / (s + e) + s_xr / (s + e),

        whose first term grows with s, which lies between s_xx.IR and s_xx.I, and whose second is
        small where c is near the true slope, whatever R explains of x.

        Parameters
        ----------
        reference
            c.
        """
        inverse, u = self.inverse, self.on(x)
        c, e = reference, error
        high = self.of(x, x) - e
        low = np.maximum(self.of(x, x) - e - np.sum((inverse @ u) * u, axis=0), 0.0)
        ends = np.array([c * low / (low + e), c * high / (high + e)])
        least, most = self.beside(x, y, error, c)
        sizes = np.array([least / (low + e), least / (high + e)])
        larger = np.array([most / (low + e), most / (high + e)])
        plain = self.slope(x, y)
        return (
            np.maximum(plain[0], ends.min(axis=0) + sizes.min(axis=0)),
            np.minimum(plain[1], ends.max(axis=0) + larger.max(axis=0)),
        )


@dataclass(frozen=True, kw_only=True, slots=True)
class Basis:
    """Covariances given I, and whoever is forced, all read without error; R is the rest."""

    rows: tuple[int, ...]
    """The ends, then R without whoever is forced."""
    first: int
    t: Matrix
    held: tuple[int, ...]
    slopes: Matrix
    """Of each row on each of the held ones, the others held."""
    spread: Vector
    """Variance of each of the held ones, the others held."""

    @classmethod
    def of(cls, sight: Sight) -> "Basis":
        """Return the basis of a node."""
        held = [*sight.parts.w, *(row for row in sight.undecided if row in sight.forced)]
        rows = [*sight.ends, *(row for row in sight.undecided if row not in sight.forced)]
        inverse = np.linalg.inv(sight.sigma[np.ix_(held, held)])
        slopes = sight.sigma[np.ix_(rows, held)] @ inverse
        return cls(
            rows=tuple(rows),
            first=len(sight.ends),
            t=sight.sigma[np.ix_(rows, rows)] - slopes @ sight.sigma[np.ix_(held, rows)],
            held=tuple(held),
            slopes=slopes,
            spread=1 / np.diag(inverse),
        )

    def closing(self, sight: Sight, one: Vector, other: Vector) -> Vector | None:
        """Return how far each of R joins two combinations of the ends that are to be independent.

        None where they are, given I and whoever is forced; whoever is forced joins nothing.
        """
        ends = self.t[: self.first, : self.first]
        size = ((one @ ends @ one) * (other @ ends @ other)) ** 0.5
        if abs(one @ ends @ other) <= CLOSED * size:
            return None
        t, first = self.t, self.first
        joined = np.abs((t[first:, :first] @ one) * (t[first:, :first] @ other))
        found = np.zeros(len(sight.undecided))
        found[[row not in sight.forced for row in sight.undecided]] = joined / np.diag(t)[first:]
        return found


@dataclass(frozen=True, slots=True)
class Reading:
    """One covariate with errors, all others without."""

    place: int
    """Among the held ones, or (from ``Basis.first`` on) among the rows."""
    is_held: bool
    error: float
    owner: int
    """Its place in R; −1 where it is decided."""
    option: int


def readings(sight: Sight, basis: Basis) -> list[Reading]:
    """Return every way with errors in which a covariate is, or can be, read."""
    numbers = {row: at for at, row in enumerate(sight.undecided)}
    people = [(place, True, row) for place, row in enumerate(basis.held)]
    people += [(p, False, row) for p, row in enumerate(basis.rows) if p >= basis.first]
    found = []
    for place, is_held, row in people:
        at = numbers.get(row, -1)
        if at < 0:
            found.append(Reading(place, is_held, sight.noise[row], -1, 0))
            continue
        errors = sight.best[at] + sight.worse[at, 1:]
        found += [Reading(place, is_held, float(e), at, k) for k, e in enumerate(errors, 1)]
    return [each for each in found if 0 < each.error < inf]


def with_rest(decided: float, together: tuple[float, float], sums: tuple[float, float]) -> float:
    """Return a bound on the bias bound that counts what single readings do not explain.

    With s_j what each reading causes alone and d all of them together, the bias bound is
    Σ|s_j| + |d − Σ s_j|. Whatever undecided readings add to the second sum they add to the first,
    so that it is at least Σ|s_j| + |d − Σ s_j| over the decided ones.

    Parameters
    ----------
    decided
        Σ|s_j| over decided readings at least.
    together, sums
        Between which numbers d lies, and Σ s_j over decided readings.
    """
    return decided + max(0.0, together[0] - sums[1], sums[0] - together[1])


def summed(
    each: Vector, owners: Sequence[int], options: Sequence[int], shape: tuple[int, ...]
) -> tuple[float, Matrix]:
    """Return what decided readings come to, and what each option of R would add."""
    more, decided = np.zeros(shape), 0.0
    for value, owner, option in zip(each.tolist(), owners, options, strict=True):
        if owner < 0:
            decided += value
        else:
            more[owner, option] = value
    return decided, more


@dataclass(frozen=True, kw_only=True, slots=True)
class Shifts:
    """How far a covariate with errors reaches: slopes of other variables on it.

    Given a valid set Z without errors, a residual r of what it is to make independent has no
    covariance with x. Were w ∈ Z read with error variance e, it would be f·b_x·b_r instead, b the
    slopes on w with Z without w held, v the variance of w that is left, and f = v·e / (v + e). The
    slopes lie in ranges, by ``slope_range`` with w in the place of x.
    """

    cases: tuple[Reading, ...]
    inverse: Matrix
    u: Matrix
    """Covariance of R with w; a column a case."""
    ww: Vector
    ends: Matrix
    """Covariance of w with each of the ends: ends × cases."""
    others: Matrix
    """Covariance of R with each of the ends: ends × R × cases."""
    blocks: Blocks

    @classmethod
    def of(cls, sight: Sight, basis: Basis) -> "Shifts":
        """Return the shifts of every covariate that is, or can be, read with errors."""
        cases, first = readings(sight, basis), basis.first
        t, size = basis.t, len(basis.rows)
        w = np.zeros((size, len(cases)))
        ww = np.zeros(len(cases))
        undone = np.zeros(len(cases))
        for number, case in enumerate(cases):
            if case.is_held:
                v = basis.spread[case.place]
                w[:, number], ww[number], undone[number] = v * basis.slopes[:, case.place], v, 1 / v
            else:
                w[:, number], ww[number] = t[:, case.place], t[case.place, case.place]
        others = t[:first, first:, None] + undone * w[:first, None] * w[None, first:]
        u = w[first:].copy()
        changed = (np.abs(u) > TINY) & (undone > 0)
        for number, case in enumerate(cases):
            if not case.is_held:
                u[case.place - first, number] = 0
                others[:, case.place - first, number] = 0
        return cls(
            cases=tuple(cases),
            inverse=np.asarray(np.linalg.inv(t[first:, first:])),
            u=u,
            ww=ww,
            ends=w[:first],
            others=others,
            blocks=Blocks.of(t[first:, first:], changed),
        )

    def slopes(self, mix: Vector) -> tuple[Vector, Vector]:
        """Return between which numbers the slope of a combination of the ends on w lies."""
        v = np.tensordot(mix, self.others, axes=1)
        return slope_range(self.inverse, self.u, v, self.ww, mix @ self.ends, self.blocks)

    @property
    def decided(self) -> NDArray[np.bool_]:
        """Which cases speak of a reading that is decided."""
        return np.array([case.owner < 0 for case in self.cases], dtype=bool)

    @property
    def factors(self) -> tuple[Vector, Vector]:
        """Between which numbers f lies in each case."""
        e = np.array([case.error for case in self.cases])
        least = np.maximum(self.ww - np.sum((self.inverse @ self.u) * self.u, axis=0), 0.0)
        return least * e / (least + e), self.ww * e / (self.ww + e)

    def summed(self, each: Vector, shape: tuple[int, ...]) -> tuple[float, Matrix]:
        """Return what decided readings come to, and what each option of R would add."""
        owners = [case.owner for case in self.cases]
        return summed(each, owners, [case.option for case in self.cases], shape)


def one_noisy(
    sight: Sight, basis: Basis, ends_with_bias: Sequence[int]
) -> tuple[View, list[int], list[int]]:
    """Return covariances with one reading as read and all others perfect, a case for each.

    For w held they are t + f·bb′ (see ``Shifts``). Readings that may yet be taken in have no case:
    what they cause alone is bounded by 0, which was measured to cost no nodes and to save time.

    Parameters
    ----------
    ends_with_bias
        Treatment and mediators.

    Returns
    -------
    tuple
        The view; owner and option of each case.
    """
    t, rows = basis.t, basis.rows
    ends = [row for row in ends_with_bias if sight.noise[row]]
    cases = [each for each in readings(sight, basis) if each.is_held]
    factors = [sight.noise[row] for row in ends]
    along = [np.eye(len(rows))[rows.index(row)] for row in ends]
    for case in cases:
        v, e = basis.spread[case.place], case.error
        factors.append(float(v * e / (v + e)))
        along.append(basis.slopes[:, case.place])
    b = np.array(along).reshape(len(factors), len(rows))
    s = t + np.array(factors)[:, None, None] * b[:, :, None] * b[:, None, :]
    view = View(s=s, base=t, errors=np.zeros(len(rows) - basis.first), first=basis.first)
    owners = [-1] * len(ends) + [case.owner for case in cases]
    return view, owners, [0] * len(ends) + [case.option for case in cases]

"""What an estimate comes to: covariances of what is read, its bias, its records, its chances.

    S_AB.C   = S_AB − S_AC S_CC⁻¹ S_CB                        partial covariance
    V          asymptotic variance of the estimate times the number of records
    β, τ       what the estimate tends to; the true effect
    keep     = max(0, min(1, β/τ))
    records  = ⌈design effect · V · (K / keep)²⌉ + number of variables measured + 1

Every ceiling of a computed number, and every comparison with one, forgives a relative 1e-9.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from math import ceil, inf, sqrt
from statistics import NormalDist
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from planner.linear import LinearModel

__all__ = [
    "FORGIVEN",
    "LEAST_KEEP",
    "ROUNDING",
    "Demand",
    "Estimate",
    "Estimator",
    "Matrix",
    "Parts",
    "Precision",
    "as_read",
    "bias_of",
    "covariance",
    "forgiving_ceil",
    "keep_of",
    "partial",
    "precision_of",
]

Matrix = NDArray[np.float64]
FORGIVEN = 1e-9
"""A computed number may be off by so much of itself."""
ROUNDING = 1e-12
"""A share that should be nothing may come out as this much."""
LEAST_KEEP = 1e-9
"""An estimate that keeps less of the effect cannot show it, on any number of records."""


def covariance(model: LinearModel, selected: Iterable[str] = ()) -> Matrix:
    """Return Σ of all variables of a linear model, given S, in the order of its names.

    Each variable has variance 1 before S is conditioned on. With p the causes of v and u any
    variable before it, Cov(v, u) = Σ_p b_vp · Cov(p, u) (Wright 1921).
    """
    at = {name: number for number, name in enumerate(model.names)}
    sigma = np.eye(len(at))
    for name, row in at.items():
        for cause, b in model.coefficients[name].items():
            sigma[row, :row] += b * sigma[at[cause], :row]
        sigma[:row, row] = sigma[row, :row]
    return partial(sigma, [at[name] for name in selected])


def partial(sigma: Matrix, given: Sequence[int]) -> Matrix:
    """Return S_AB.C for all A and B at once; the rows of C itself come out as zero.

    Like all formulas of the routes it takes a stack of matrices too: the last two axes count.
    """
    rows = list(given)
    if not rows:
        return sigma
    across = sigma[..., rows]
    held = sigma[..., rows, :][..., rows]
    left: Matrix = sigma - across @ np.linalg.solve(held, np.swapaxes(across, -1, -2))
    return left


def as_read(sigma: Matrix, noise: Mapping[int, float]) -> Matrix:
    """Return the covariance of readings: those with errors vary by that much more.

    Parameters
    ----------
    noise
        Variance of the error of each reading: 1/reliability − 1, the variable's own being 1.
    """
    read = sigma.copy()
    for row, variance in noise.items():
        read[row, row] += variance
    return read


@dataclass(frozen=True, kw_only=True, slots=True)
class Parts:
    """Which rows of a covariance matrix play which part."""

    x: int
    y: int
    w: tuple[int, ...]
    """Covariates."""
    z: tuple[int, ...] = ()
    """The instrument, if there is one."""
    m: tuple[int, ...] = ()
    """Mediators."""

    @property
    def measured(self) -> int:
        """The number of variables measured."""
        return 2 + len(self.w) + len(self.z) + len(self.m)

    def renumbered(self, at: Mapping[int, int]) -> "Parts":
        """Return the same parts of a smaller matrix."""
        return Parts(
            x=at[self.x],
            y=at[self.y],
            w=tuple(at[row] for row in self.w),
            z=tuple(at[row] for row in self.z),
            m=tuple(at[row] for row in self.m),
        )


@dataclass(frozen=True, slots=True)
class Estimate:
    """What one route's estimate does on many records."""

    limit: float
    """β."""
    variance: float
    """V."""
    strength: float | None = None
    """For an instrument the first-stage F per record: (s_xx.W − s_xx.WZ) / s_xx.WZ."""


class Estimator(Protocol):
    """What a route's ``precision.py`` offers, as pure functions of a covariance matrix."""

    def estimate(self, sigma: Matrix, parts: Parts) -> Estimate:
        """Return β, V and what the first stage is worth."""

    def limit(self, sigma: Matrix, parts: Parts) -> Matrix:
        """Return β alone, for a matrix or for each of a stack."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Demand:
    """What is demanded of an estimate, and what is known beforehand."""

    sigma: Matrix
    """Covariances of the variables that matter, given S."""
    rows: Mapping[str, int]
    effect: float
    """τ."""
    z: float
    """The quantile of the confidence interval."""
    reach: float | None
    """K: an estimate of variance V on n records is good enough if √(V/n) · K ≤ 1. None where the
    number of records, or the money, is given instead."""
    records: int | None = None
    """The number of records, where it is held."""
    at_least: int = 0
    """The number of records is no smaller, whatever would do."""
    spend: float | None = None
    """The money that is to buy the narrowest interval."""
    bias: float = inf
    """The largest bias bound that is tolerated."""
    least_f: float = 0.0
    """The least first-stage F."""
    design_effects: Mapping[str, float] = field(default_factory=dict)
    """By route; 1 where a route is not named."""
    scale: float = 1.0
    """An effect of 1 in the units of the answer."""

    def design_effect(self, route: str) -> float:
        """Return by what the records of a route are multiplied."""
        return self.design_effects.get(route, 1.0)


@dataclass(frozen=True, kw_only=True, slots=True)
class Precision:
    """What a plan achieves on its records; effects in the units of the answer."""

    effect: float
    limit: float
    variance: float
    bias_bound: float
    """Share of the effect."""
    bias_sources: Mapping[str, float]
    """By reading, as VARIABLE.WAY: the bias that it causes alone, as a share of the effect."""
    half_width: float
    power: float
    coverage: float
    first_stage_f: float | None


def forgiving_ceil(number: float) -> int:
    """Return the next whole number up, rounding errors forgiven.

    Examples
    --------
    >>> forgiving_ceil(230.00000001), forgiving_ceil(230.1)
    (230, 231)
    """
    return ceil(number * (1 - FORGIVEN))


def keep_of(limit: float, effect: float) -> float:
    """Return what the readings leave of the effect: max(0, min(1, β/τ))."""
    return max(0.0, min(1.0, limit / effect))


def bias_of(
    estimator: Estimator, sigma: Matrix, parts: Parts, noise: Mapping[int, float], effect: float
) -> tuple[float, dict[int, float]]:
    """Return the bias bound, and by reading the bias that it causes alone, as shares of the effect.

    With single_j = β when only reading j is as read and all others perfect, less τ,

        bound = ( Σ_j |single_j| + | β − τ − Σ_j single_j | ) / |τ|  ≥  |β − τ| / |τ|.

    Signed errors can cancel, and two poor readings on one path may do no harm one at a time; a plan
    leans on neither.
    """
    rows = [parts.x, parts.y, *parts.w, *parts.z, *parts.m]
    noisy = [row for row in sorted(rows) if row != parts.y and noise.get(row, 0.0) > 0]
    # All cases in one stack of small matrices: perfect but for one reading, and all as read.
    small, at = sigma[np.ix_(rows, rows)], {row: place for place, row in enumerate(rows)}
    stack = np.repeat(small[None], len(noisy) + 1, axis=0)
    for case, row in enumerate(noisy):
        stack[[case, -1], at[row], at[row]] += noise[row]
    limits = np.asarray(estimator.limit(stack, parts.renumbered(at))) - effect
    singles, together = limits[:-1], float(limits[-1])
    bound = (float(np.abs(singles).sum()) + abs(together - float(singles.sum()))) / abs(effect)
    return bound, {
        row: abs(float(single) / effect) for row, single in zip(noisy, singles, strict=True)
    }


def precision_of(
    estimate: Estimate,
    demand: Demand,
    design_effect: float,
    *,
    records: int,
    measured: int,
) -> tuple[float, float, float]:
    """Return half-width, power and coverage on so many records.

    With se = √(design effect · V / (n − measured − 1)) and b = (β − τ)/se: half-width z·se/keep,
    power Φ(keep·|τ|/se − z), coverage of τ (not of β) Φ(z − b) − Φ(−z − b).
    """
    normal, z, effect = NormalDist(), demand.z, demand.effect
    se = sqrt(design_effect * estimate.variance / (records - measured - 1))
    keep = keep_of(estimate.limit, effect)
    shift = (estimate.limit - effect) / se
    return (
        z * se / keep if keep > LEAST_KEEP else inf,
        normal.cdf(keep * abs(effect) / se - z),
        normal.cdf(z - shift) - normal.cdf(-z - shift),
    )

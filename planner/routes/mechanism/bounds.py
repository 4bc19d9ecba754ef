"""What no plan of the mechanism below a node of the search can beat.

With I decided, R undecided, T ⊆ R, W = I ∪ T, and N = s_yy.xMW, the two parts of V are

    V = b′S_MM.xW b / s_xx.W + N · a′S_MM.xW⁻¹a,   the first (s_yy.xW − s_yy.xMW) / s_xx.W  (1)

Once the mediators are decided, with m any fixed combination of them,

    s_yy.xW − s_yy.xMW ≥ s_ym.xW² / s_mm.xW                                                (2)
    a′S_MM.xW⁻¹a ≥ (coefficient of x in the regression of m)² / s_mm.xW                    (3)
    s_mm.xW ≤ s_mm.xI,   s_xx.W ≤ s_xx.I                                                   (4)
    β = Σ over mediators of a_m b_m                                                        (5)

by Cauchy and Schwarz for (2) and (3); the coefficients and covariances that are left lie in ranges
by facts 1 and 2 of ``planner.ranges``, and m is the combination that is best on I. Before that,
with the undecided mediators all read at their best,

    V / keep² ≥ 2 |τ| √(N / s_xx.I):                                                       (6)

the parts of (1) have a product of at least (a′b)² N / s_xx.W, and a sum is at least twice the root
of a product; so V ≥ 2 |β| √(N / s_xx.W), and V / min(τ², β²) ≥ 2 √(N / s_xx.I) / |τ|.

A single reading with errors causes at least the bias by which its range of (5) misses τ.      (7)

Since keep ≤ β/τ, and (a′b)² is at most a′P⁻¹a · b′Pb with P = S_MM.xW, (1) also gives

    V / keep² ≥ τ² · ( 1 / (s_xx.W · a′P⁻¹a) + N / b′Pb ),                                 (8)

an equation where there is one mediator. P lies between S_MM.xIR and S_MM.xI, a and b in their
ranges.
"""

from collections.abc import Sequence

import numpy as np

from planner.bounds import Basis, Floor, Sight, View, one_noisy, summed, with_rest
from planner.precision import Matrix, keep_of
from planner.ranges import Vector, distances, increments, product_ranges, slope_range

__all__ = ["floor"]

X, Y, FIRST = 0, 1, 2
"""Mediators come after treatment and outcome."""


def floor(sight: Sight) -> Floor:
    """Return what no plan below a node can beat."""
    view = sight.as_read()
    given_x = given = view.given(X)
    for place in range(FIRST, view.first):
        given = given.given(place)
    inverse, c = given.inverse, given.on(Y)[:, 0]
    b, xx = inverse @ c, float(view.of(X, X)[0])
    least = float(given.of(Y, Y)[0] - c @ b)
    kappa = 2 * abs(sight.effect) / xx**0.5
    gains = increments(b, inverse, view.worse)
    related = view.shares(X)
    if sight.open_mediators:
        return Floor(least=least, increments=gains, kappa=kappa, related=related)
    errors = [sight.noise[row] for row in sight.ends]
    ranges = coefficients(view, given_x, errors)
    low, high = (end[0] for end in product_sums(*ranges))
    keep = max(keep_of(float(low), sight.effect), keep_of(float(high), sight.effect))
    together = (float(low) - sight.effect, float(high) - sight.effect)
    bias, decided, more = biases(sight, together)
    both = two_parts(view, given_x, keep), by_ratio(view, given_x, *ranges, sight.effect)
    alpha, gamma = max(both, key=lambda each: each[0] + each[1] * least)
    return Floor(
        least=least,
        increments=gains,
        alpha=alpha,
        gamma=gamma,
        kappa=kappa,
        is_dead=not keep,
        bias=bias,
        decided_bias=decided,
        more_bias=more,
        related=relations(view, given_x),
    )


def relations(view: View, given_x: View) -> Vector:
    """Return how far each of R widens the ranges of a and b: where it is related to both ends."""
    found = []
    for m in range(FIRST, view.first):
        for seen, one, other in ((view, X, m), (given_x, m, Y)):
            slope = float(seen.of(one, other)[0] / seen.of(one, one)[0])
            found.append(seen.joined(one, other, slope))
    return np.asarray(np.max(found, axis=0))


Coefficients = list[tuple[Vector, Vector]]
"""For each mediator between which numbers its coefficient lies, in each case."""


def coefficients(
    view: View, given_x: View, errors: Sequence[float] = ()
) -> tuple[Coefficients, Coefficients]:
    """Return the ranges of a and of b.

    Parameters
    ----------
    errors
        Error variance of each of the ends, where it is the same in all cases.
    """

    def slope(seen: View, one: int, other: int) -> tuple[Vector, Vector]:
        if not errors or not errors[one]:
            return seen.slope(one, other)
        true = float(seen.of(one, one)[0]) - errors[one]
        reference = float(seen.of(one, other)[0]) / true
        return seen.slope_with_errors(one, other, errors[one], reference)

    a, b = [], []
    for m in range(FIRST, view.first):
        given = given_x
        for other in range(FIRST, view.first):
            if other != m:
                given = given.given(other)
        a.append(slope(view, X, m))
        b.append(slope(given, m, Y))
    return a, b


def product_sums(a: Coefficients, b: Coefficients) -> tuple[Vector, Vector]:
    """Return the range of (5) in each case."""
    pairs = [product_ranges(*each) for each in zip(a, b, strict=True)]
    return np.sum([low for low, _ in pairs], axis=0), np.sum([high for _, high in pairs], axis=0)


def by_ratio(
    view: View, given_x: View, a: Coefficients, b: Coefficients, effect: float
) -> tuple[float, float]:
    """Return alpha and gamma by (8)."""
    m = slice(FIRST, view.first)
    p_most = given_x.s[0, m, m]
    u = given_x.s[0, view.first :, m]
    p_least = p_most - u.T @ given_x.inverse @ u
    a_most = np.array([float(np.abs(each).max()) for each in a])
    b_most = np.array([float(np.abs(each).max()) for each in b])
    told = a_most @ np.abs(np.linalg.inv(p_least)) @ a_most * view.of(X, X)[0]
    carried = b_most @ np.abs(p_most) @ b_most
    return float(effect**2 / told), float(effect**2 / carried)


def two_parts(view: View, given_x: View, keep: float) -> tuple[float, float]:
    """Return alpha by (2), and gamma by (3)."""
    if not keep:
        return 0.0, 0.0
    m = slice(FIRST, view.first)
    s_mm, s_my = given_x.s[0, m, m], given_x.s[0, m, Y]
    mix = np.linalg.solve(s_mm, s_my)
    mixed = (given_x.s[0, view.first :, m] @ mix)[:, None]
    low, high = given_x.taken(given_x.on(Y), mixed)
    joint, xx = float(s_my @ mix), float(view.of(X, X)[0])
    nearest = float(distances(joint - high, joint - low, 0.0)[0])
    first = nearest**2 / (joint * xx) if joint > 0 else 0.0
    a = view.s[0, m, X] / xx
    mix = np.linalg.solve(s_mm, a)
    v = (view.s[0, view.first :, m] @ mix)[:, None]
    xm = np.array([xx * (a @ mix)])
    along = slope_range(view.inverse, view.on(X), v, np.array([xx]), xm, view.blocks)
    nearest = float(distances(*along, 0.0)[0])
    spread = float(mix @ s_mm @ mix)
    second = nearest**2 / spread if spread > 0 else 0.0
    return first / keep**2, second / keep**2


def biases(sight: Sight, together: tuple[float, float]) -> tuple[float, float, Matrix | None]:
    """Return bounds on the bias bound, as shares of the effect.

    Returns
    -------
    tuple
        A bound for all below; (7) for what is decided; (7) for each option of R.
    """
    if not sight.with_bias:
        return 0.0, 0.0, None
    view, owners, options = one_noisy(sight, Basis.of(sight), [sight.parts.x, *sight.parts.m])
    lows, highs = product_sums(*coefficients(view, view.given(X)))
    size = abs(sight.effect)
    each = distances(lows, highs, sight.effect) / size
    decided, more = summed(each, owners, options, sight.worse.shape)
    own = np.array(owners, dtype=int) < 0
    sums = float((lows[own] - sight.effect).sum()), float((highs[own] - sight.effect).sum())
    rest = with_rest(decided * size, together, sums) / size
    return max(rest, together[0] / size, -together[1] / size), decided, more

"""What no covariates of an instrument can beat, below a node of the search.

With I decided, R undecided, T ⊆ R, W = I ∪ T, z the instrument:

    s_xx.W − s_xx.WZ = s_xz.W² / s_zz.W is at most the smaller of                          (1)
        (largest |s_xz.IT|)² / s_zz.IR         and        s_xx.I − s_xx.zIR
    β = s_zy.W / s_zx.W lies in a range around its value on I, by facts 1 and 2            (2)
    √s_rr.W ≥ √s_r₀r₀.W − |β − β₀| √s_xx.W     with r₀ = Y − β₀X, β₀ the value on I        (3)

(3) is the triangle inequality; and s_rr.W ≥ s_yy.xW whatever β is, since βX takes out no more of Y
than the best multiple of X does. N is s_r₀r₀.W or s_yy.xW, whichever leads further.

Errors of instrument and treatment cause no bias; those of a covariate w alone cause, with
r = Y − τX and ``Shifts``,

    f b_z b_r / (s_zx.W + f b_z b_x).                                                      (4)
"""

from math import inf

import numpy as np

from planner.bounds import Basis, Floor, Shifts, Sight, View
from planner.precision import Matrix, keep_of
from planner.ranges import TINY, Blocks, Vector, distances, increments, ranged, sizes

__all__ = ["floor"]

X, Y, Z = 0, 1, 2


def floor(sight: Sight) -> Floor:
    """Return what no plan below a node can beat."""
    view = sight.as_read()
    inverse = view.inverse
    moved, unmoved = first_stage(view, inverse)
    base, off, low, high = effect_range(view)
    keep = max(keep_of(low, sight.effect), keep_of(high, sight.effect))
    xx = float(view.of(X, X)[0])
    # (3), and what is left of Y given X
    given_x = view.given(X)
    left = [(1.0, *left_over(given_x.of(Y, Y)[0], given_x.on(Y)[:, 0], given_x.inverse))]
    if off < inf:
        s_rr = view.of(Y, Y)[0] - 2 * base * view.of(X, Y)[0] + base**2 * xx
        least, b, same = left_over(s_rr, (view.on(Y) - base * view.on(X))[:, 0], inverse)
        share = max(0.0, 1 - off * (xx / least) ** 0.5) ** 2
        left.append((share, least, b, same))
    share, least, b, weighed = max(left, key=lambda each: each[0] * each[1])
    basis = Basis.of(sight)
    decided, more = single_biases(sight, basis)
    return Floor(
        least=least,
        increments=increments(b, weighed, view.worse),
        gamma=share / (moved * keep**2) if keep and moved > 0 else 0.0,
        strongest=moved / unmoved,
        is_dead=not keep or moved <= 0,
        bias=float(distances(np.array(low), np.array(high), sight.effect)) / abs(sight.effect),
        decided_bias=decided,
        more_bias=more,
        related=np.maximum(0.1 * view.shares(X), view.shares(Z)),
        closing=basis.closing(
            sight, np.array([0.0, 0.0, 1.0]), np.array([-sight.effect, 1.0, 0.0])
        ),
    )


def first_stage(view: View, inverse: Matrix) -> tuple[float, float]:
    """Return (1), and the least that s_xx.WZ can be: s_xx.zIR."""
    u, q = view.on(X)[:, 0], view.on(Z)[:, 0]
    xx, xz, zz = (float(view.of(*ends)[0]) for ends in ((X, X), (X, Z), (Z, Z)))
    zz_least = zz - q @ inverse @ q
    low, high = (float(end[0]) for end in view.taken(view.on(Z), view.on(X)))
    by_ranges = max(abs(xz - high), abs(xz - low)) ** 2 / zz_least
    unmoved = xx - u @ inverse @ u - (xz - u @ inverse @ q) ** 2 / zz_least
    return float(min(by_ranges, xx - unmoved)), float(unmoved)


def effect_range(view: View) -> tuple[float, float, float, float]:
    """Return β on I, how far from it β can be, and the ends of the range of (2)."""
    u, v, q = view.on(X), view.on(Y), view.on(Z)
    zx, zy = float(view.of(Z, X)[0]), float(view.of(Z, Y)[0])
    low, high = (float(end[0]) for end in view.taken(q, u))
    nearest = max(0.0, zx - high, low - zx)
    if nearest <= TINY * float(view.of(X, X)[0] * view.of(Z, Z)[0]) ** 0.5:
        return 0.0, inf, -inf, inf
    beta = zy / zx
    low, high = (float(end[0]) for end in view.taken(q, v - beta * u))
    down, up = sorted((-high / nearest, -low / nearest))
    if zx < 0:
        down, up = -up, -down
    return beta, max(-down, up), beta + down, beta + up


def left_over(variance: float, c: Vector, inverse: Matrix) -> tuple[float, Vector, Matrix]:
    """Return the variance that R leaves of something, and b and A⁻¹ of fact 3."""
    b = inverse @ c
    return float(variance - c @ b), b, inverse


def single_biases(sight: Sight, basis: Basis) -> tuple[float, Matrix | None]:
    """Return (4) for what is decided, and for each option of R, as shares of the effect."""
    if not sight.with_bias:
        return 0.0, None
    effect = sight.effect
    shifts, t, first = Shifts.of(sight, basis), basis.t, basis.first
    nobody = np.zeros((len(t) - first, 1), dtype=bool)
    low, high = ranged(
        shifts.inverse,
        t[first:, [Z]],
        t[first:, [X]],
        Blocks.of(t[first:, first:], nobody),
    )
    zx = max(abs(t[Z, X] - low), abs(t[Z, X] - high))
    z_least, z_most = sizes(*shifts.slopes(np.array([0.0, 0.0, 1.0])))
    r_least, _ = sizes(*shifts.slopes(np.array([-effect, 1.0, 0.0])))
    _, x_most = sizes(*shifts.slopes(np.array([1.0, 0.0, 0.0])))
    f_least, f_most = shifts.factors
    reach = zx + f_most * z_most * x_most
    each = np.divide(f_least * z_least * r_least, reach, out=np.zeros_like(reach), where=reach > 0)
    return shifts.summed(each / abs(effect), sight.worse.shape)

"""What no set of covariates below a node of the search can beat.

With I decided, R undecided, T ⊆ R:

    V = s_yy.xIT / s_xx.IT ≥ N / s_xx.I,   N = s_yy.xIT,                                   (1)

since s_xx.IT ≤ s_xx.I, whoever is forced among I, read worst; N is no less than s_yy.xIR, by what
fact 3 of ``planner.ranges`` says.

    keep ≤ β/τ at the upper end of the range of β                                          (2)

With e the error variance of x, s = s_xx.W − e and ρ at least s_xr.W for r = Y − τX, τ > 0,

    V / keep² ≥ V τ²/β² = N τ² (s + e) / (τ s + s_xr.W)² ≥ N τ² (s_I + e) / (τ s_I + ρ)²   (5)

where ρ ≤ τ (s + 2e), since (τ s + ρ)² / (s + e) then grows with s; for τ < 0 signs change.

A valid set Z read perfectly gives τ. So the treatment alone, read with error variance e, takes

    e / (s_xx.Z + e) ≥ e / (s_xx.I + e)                                                    (3)

of it away, and a covariate w alone, with r = Y − τX and ``Shifts``, changes it by

    f b_x b_r / (s_xx.Z + f b_x²),   s_xx.Z ≤ s_xx.I.                                      (4)

These add up to a bound on the bias bound; the distance of the range of (2) from τ is another one.
"""

import numpy as np

from planner.bounds import Basis, Floor, Shifts, Sight, View, with_rest
from planner.precision import Matrix, keep_of
from planner.ranges import distances, increments, product_ranges, sizes

__all__ = ["floor"]

X, Y = 0, 1


def floor(sight: Sight) -> Floor:
    """Return what no plan below a node can beat."""
    view = sight.as_read()
    error = sight.noise[sight.parts.x]
    low, high = (end[0] for end in view.slope_with_errors(X, Y, error, sight.effect))
    keep = max(keep_of(float(low), sight.effect), keep_of(float(high), sight.effect))
    given_x = view.given(X)
    inverse, c = given_x.inverse, given_x.on(Y)[:, 0]
    b = inverse @ c
    basis = Basis.of(sight)
    together = (float(low) - sight.effect, float(high) - sight.effect)
    bias, decided, more = biases(sight, basis, together)
    return Floor(
        least=float(given_x.of(Y, Y)[0] - c @ b),
        increments=increments(b, inverse, view.worse),
        gamma=steepest(view, sight.effect, error, keep),
        is_dead=not keep,
        bias=bias,
        decided_bias=decided,
        more_bias=more,
        related=np.maximum(0.1 * view.shares(X), view.joined(X, Y, sight.effect)),
        closing=basis.closing(sight, np.array([1.0, 0.0]), np.array([-sight.effect, 1.0])),
    )


def steepest(view: View, effect: float, error: float, keep: float) -> float:
    """Return what N is multiplied by: the larger of (1) with (2), and (5)."""
    if not keep:
        return 0.0
    sign = 1 if effect > 0 else -1
    xx, u, size = float(view.of(X, X)[0]), view.on(X)[:, 0], abs(effect)
    s = xx - error
    least = max(s - float(u @ view.inverse @ u), 0.0)
    low, high = view.beside(X, Y, error, effect)
    rho = float(np.maximum(sign * low, sign * high)[0])
    plain = 1 / (xx * keep**2)
    if rho > size * (least + 2 * error) or size * s + rho <= 0:
        return plain
    return max(plain, effect**2 * xx / (size * s + rho) ** 2)


def biases(
    sight: Sight, basis: Basis, together: tuple[float, float]
) -> tuple[float, float, Matrix | None]:
    """Return bounds on the bias bound, as shares of the effect.

    Returns
    -------
    tuple
        A bound for all below; (3) and (4) for what is decided; (4) for each option of R.
    """
    if not sight.with_bias:
        return 0.0, 0.0, None
    shifts, effect, first = Shifts.of(sight, basis), sight.effect, basis.first
    xx, u = float(basis.t[X, X]), basis.t[first:, X]
    left = max(xx - float(u @ shifts.inverse @ u), 0.0)
    x_slopes, r_slopes = (shifts.slopes(np.array(mix)) for mix in ([1.0, 0.0], [-effect, 1.0]))
    x_least, x_most = sizes(*x_slopes)
    f_least, f_most = shifts.factors
    small, large = f_least / (xx + f_least * x_most**2), f_most / (left + f_most * x_least**2)
    down, up = product_ranges(x_slopes, r_slopes)
    lows = np.where(down > 0, small, large) * down
    highs = np.where(up > 0, large, small) * up
    each = distances(lows, highs, 0.0) / abs(effect)
    decided, more = shifts.summed(each, sight.worse.shape)
    e = sight.noise[sight.parts.x]
    own = sorted((-effect * e / (left + e), -effect * e / (xx + e))) if e else (0.0, 0.0)
    decided += e / (xx + e)
    sums = (
        float(lows[shifts.decided].sum()) + own[0],
        float(highs[shifts.decided].sum()) + own[1],
    )
    size = abs(effect)
    rest = with_rest(decided * size, together, sums) / size
    return max(rest, distance(together) / size), decided, more


def distance(together: tuple[float, float]) -> float:
    """Return how far a range is from 0."""
    return max(0.0, together[0], -together[1])

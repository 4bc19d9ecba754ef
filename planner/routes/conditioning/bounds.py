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

from planner.bounds import Basis, Floor, Shifts, Sight, View
from planner.precision import Matrix, keep_of
from planner.ranges import distances, increments

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
    decided, more = single_biases(sight, basis)
    return Floor(
        least=float(given_x.of(Y, Y)[0] - c @ b),
        increments=increments(b, inverse, view.worse),
        gamma=steepest(view, sight.effect, error, keep),
        is_dead=not keep,
        bias=float(distances(low, high, sight.effect)) / abs(sight.effect),
        decided_bias=decided,
        more_bias=more,
        related=view.shares(X),
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


def single_biases(sight: Sight, basis: Basis) -> tuple[float, Matrix | None]:
    """Return (3) for what is decided, and (4) for each option of R, as shares of the effect."""
    if not sight.with_bias:
        return 0.0, None
    shifts = Shifts.of(sight, basis)
    xx, effect = basis.t[X, X], sight.effect
    x_least, x_most = shifts.slopes(np.array([1.0, 0.0]))
    r_least, _ = shifts.slopes(np.array([-effect, 1.0]))
    f_least, f_most = shifts.factors
    each = f_least * x_least * r_least / (xx + f_most * x_most**2)
    decided, more = shifts.summed(each / abs(effect), sight.worse.shape)
    e = sight.noise[sight.parts.x]
    return decided + e / (xx + e), more

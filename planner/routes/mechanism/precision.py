"""The precision of the mechanism: treatment on mediators, times mediators on outcome.

    a = S_MX.W / s_xx.W,   b = coefficients of M in Y on M, X and W                        (1)
    β = a′b                                                                                (2)
    V = b′ S_MM.XW b / s_xx.W + s_yy.MXW · a′ S_MM.XW⁻¹ a                                  (3)

Both stages adjust for the same covariates, so that their errors are uncorrelated and the two parts
of V add up; derived from the limit law of a covariance matrix, and compared with simulation.
"""

import numpy as np

from planner.precision import Estimate, Matrix, Parts, partial

__all__ = ["estimate", "limit"]


def estimate(sigma: Matrix, parts: Parts) -> Estimate:
    """Return (2) and (3)."""
    x, y, m = parts.x, parts.y, list(parts.m)
    s = partial(sigma, parts.w)
    a = s[m, x] / s[x, x]
    given_x = partial(s, [x])
    s_mm, s_my = given_x[np.ix_(m, m)], given_x[m, y]
    b = np.linalg.solve(s_mm, s_my)
    s_yy = given_x[y, y] - s_my @ b
    variance = s_my @ b / s[x, x] + s_yy * (a @ np.linalg.solve(s_mm, a))
    return Estimate(float(a @ b), float(variance))


def limit(sigma: Matrix, parts: Parts) -> Matrix:
    """Return (2)."""
    x, y, m = parts.x, parts.y, list(parts.m)
    s = partial(sigma, parts.w)
    a = s[..., m, x] / s[..., x, x, None]
    given_x = partial(s, [x])
    s_mm = given_x[..., m, :][..., m]
    b = np.linalg.solve(s_mm, given_x[..., m, y, None])[..., 0]
    beta: Matrix = np.sum(a * b, axis=-1)
    return beta

"""The precision of adjusting for covariates by linear regression.

    β = s_xy.Z / s_xx.Z                                                                    (1)
    V = s_yy.xZ / s_xx.Z                                                                   (2)

References
----------
Henckel, Perković & Maathuis (2022), Graphical criteria for efficient total effect estimation via
adjustment in causal linear models, JRSS-B 84 (formula from memory, compared with simulation).
"""

from planner.precision import Estimate, Matrix, Parts, partial

__all__ = ["estimate", "limit"]


def estimate(sigma: Matrix, parts: Parts) -> Estimate:
    """Return (1) and (2)."""
    x, y = parts.x, parts.y
    s = partial(sigma, parts.w)
    beta = s[x, y] / s[x, x]
    return Estimate(float(beta), float((s[y, y] - beta * s[x, y]) / s[x, x]))


def limit(sigma: Matrix, parts: Parts) -> Matrix:
    """Return (1)."""
    s = partial(sigma, parts.w)
    beta: Matrix = s[..., parts.x, parts.y] / s[..., parts.x, parts.x]
    return beta

"""The precision of an instrument, by two-stage least squares with the same covariates in both.

    β = s_zy.W / s_zx.W                                                                    (1)
    V = s_rr.W / (s_xx.W − s_xx.WZ),  r = Y − βX, Z = {z}                                  (2)
    F = n · (s_xx.W − s_xx.WZ) / s_xx.WZ                 of the first stage, on n records  (3)

References
----------
Henckel, Buttenschön & Maathuis (2024), Graphical tools for selecting conditional instrumental sets,
Biometrika 111 (formula from memory, compared with simulation).
"""

from math import inf

import numpy as np

from planner.precision import Estimate, Matrix, Parts, partial

__all__ = ["estimate", "limit"]

NOTHING = 1e-20
"""A squared correlation below this is a sum that cancels."""


def estimate(sigma: Matrix, parts: Parts) -> Estimate:
    """Return (1), (2) and (3) for one record; nothing is learnt where z does not move x."""
    x, y, (z,) = parts.x, parts.y, parts.z
    s = partial(sigma, parts.w)
    moved = s[x, z] ** 2 / s[z, z]
    if moved <= NOTHING * s[x, x]:
        return Estimate(0.0, inf, 0.0)
    beta = s[z, y] / s[z, x]
    s_rr = s[y, y] - 2 * beta * s[x, y] + beta**2 * s[x, x]
    return Estimate(float(beta), float(s_rr / moved), float(moved / (s[x, x] - moved)))


def limit(sigma: Matrix, parts: Parts) -> Matrix:
    """Return (1); 0 where z does not move x."""
    s = partial(sigma, parts.w)
    (z,) = parts.z
    zy, zx = s[..., z, parts.y], s[..., z, parts.x]
    least = (NOTHING * s[..., z, z] * s[..., parts.x, parts.x]) ** 0.5
    beta: Matrix = np.divide(zy, zx, out=np.zeros_like(zy), where=np.abs(zx) > least)
    return beta

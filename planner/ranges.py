"""Between which numbers lies what an undecided set of covariates takes out of a covariance.

A node of the search has decided on some covariates, I, each as read in its way; R is undecided, and
whatever subset T ⊆ R is added, in whatever ways, stays between two extremes. Given I, let A be the
covariance of R read in its best ways, and u, v the covariances of R with two other variables. What
T takes out of the covariance of the two is u′Bv for a matrix B with 0 ⪯ B ⪯ A⁻¹: for the ways
chosen B = (A_TT + E)⁻¹ on T and 0 elsewhere, E ⪰ 0 the errors beyond the best ways. Three facts
follow, and all bounds of the routes are made of them.

1.  u′Bu lies between 0 and u′A⁻¹u.
2.  u′Bv lies within ½ (u′A⁻¹v ∓ √(u′A⁻¹u · v′A⁻¹v)). As a function of B it is linear, so that it is
    extreme where A½BA½ is a projection P; and a′Pb = ¼ |P(a + b)|² − ¼ |P(a − b)|² for unit vectors
    a, b is at most ½ (1 + a′b), reached by the projection on a + b, and at least ½ (a′b − 1).
3.  With b = A⁻¹c, E the errors beyond the best ways (∞ for what is left out) and D a diagonal
    matrix with D ⪰ A⁻¹, what is not taken out, c′(A⁻¹ − B)c = b′(A⁻¹ + E⁻¹)⁻¹b (Woodbury), is at
    least Σ_j b_j² / (D_jj + 1/E_jj): a price of each worse choice that can be added up.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.precision import Matrix

__all__ = [
    "TINY",
    "Blocks",
    "Vector",
    "distances",
    "increments",
    "product_ranges",
    "ranged",
    "sizes",
    "slope_range",
]

Vector = NDArray[np.float64]
TINY = 1e-12
"""A covariance below this is none."""


@dataclass(frozen=True, slots=True)
class Blocks:
    """Parts of R without covariance between them: a choice among one has no say in another."""

    members: Matrix
    """Blocks × R: 1 for who belongs to it."""
    joined: NDArray[np.bool_]
    """Blocks × cases: the blocks that are one in a case."""

    @classmethod
    def of(cls, a: Matrix, changed: NDArray[np.bool_]) -> "Blocks":
        """Return the blocks of a covariance matrix.

        Parameters
        ----------
        changed
            R × cases: whose covariances differ in a case; their blocks are taken as one.
        """
        size = np.sqrt(np.diag(a))
        near = np.abs(a) > TINY * size[:, None] * size
        np.fill_diagonal(near, val=True)
        labels = np.arange(len(a))
        while len(a):
            spread = np.where(near, labels, len(a)).min(axis=1)
            if (spread == labels).all():
                break
            labels = spread
        members = (labels == np.unique(labels)[:, None]).astype(float)
        return cls(members, members @ changed > 0)

    def sums(self, values: Matrix) -> Matrix:
        """Return sums over each block, and then over all that are one; columns are cases."""
        each: Matrix = self.members @ values
        if not self.joined.any():
            return each
        whole = np.where(self.joined, each, 0).sum(axis=0, keepdims=True)
        return np.vstack([np.where(self.joined, 0, each), whole])


def ranged(inverse: Matrix, u: Matrix, v: Matrix, blocks: Blocks) -> tuple[Vector, Vector]:
    """Return between which numbers u′Bv lies: fact 2 in each block; columns are cases."""
    left = inverse @ u
    both = blocks.sums(left * v)
    squares = blocks.sums(left * u) * blocks.sums((inverse @ v) * v)
    bound = np.sqrt(np.maximum(squares, 0))
    low, high = ((both - bound) / 2).sum(axis=0), ((both + bound) / 2).sum(axis=0)
    # Nothing at all may be taken out; rounding must not rule that out.
    return np.minimum(low, 0.0), np.maximum(high, 0.0)


def slope_range(
    inverse: Matrix, u: Matrix, v: Matrix, xx: Vector, xy: Vector, blocks: Blocks
) -> tuple[Vector, Vector]:
    """Return between which numbers the coefficient of x in the regression of y lies.

    With no member of R it is β = xy / xx, and r = y − βx has no covariance with x. With T,

        β_T − β = −u′B(v − βu) / (xx − u′Bu),

    whose numerator is bounded by fact 2 and whose denominator by fact 1.

    Parameters
    ----------
    inverse
        A⁻¹ or anything larger.
    u, v
        Covariances of R with x and with y, given the rest; columns are cases.
    xx, xy
        Variance of x as read, and its covariance with y.
    """
    beta = xy / xx
    low, high = ranged(inverse, u, v - beta * u, blocks)
    # With more than A⁻¹ nothing may be left.
    least = np.maximum(xx - np.sum((inverse @ u) * u, axis=0), TINY * xx)
    return beta - high / least, beta - low / least


def increments(b: Vector, inverse: Matrix, worse: Matrix) -> Matrix:
    """Return Σ's terms in fact 3 for every option: b_j² / (D_jj + 1/E_jj).

    D_jj = Σ_k |P_jk| w_k / w_j with P = A⁻¹ and any w > 0: then D − P is diagonally dominant after
    scaling, hence D ⪰ P. w = |b| favours whoever matters; a share of the mean keeps w above 0.
    """
    if not len(b):
        return worse
    sizes = np.abs(b)
    weights = sizes + 0.01 * sizes.mean() + 1e-12
    dominant = np.abs(inverse) @ weights / weights
    with np.errstate(divide="ignore"):
        found: Matrix = b[:, None] ** 2 / (dominant[:, None] + 1 / worse)
    return found


def product_ranges(
    one: tuple[Vector, Vector], other: tuple[Vector, Vector]
) -> tuple[Vector, Vector]:
    """Return between which numbers the products of two numbers lie."""
    ends = np.array([a * b for a in one for b in other])
    return ends.min(axis=0), ends.max(axis=0)


def sizes(low: Vector, high: Vector) -> tuple[Vector, Vector]:
    """Return between which sizes numbers in some ranges lie."""
    return distances(low, high, 0.0), np.maximum(np.abs(low), np.abs(high))


def distances(low: Vector, high: Vector, value: float) -> Vector:
    """Return how far a value is from each range."""
    found: Vector = np.maximum(0.0, np.maximum(low - value, value - high))
    return found

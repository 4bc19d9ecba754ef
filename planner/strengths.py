"""Path coefficients of a linear model in which every variable has variance 1.

Plain Python: the study is checked before any library for numbers is loaded.
"""

from collections.abc import Iterable, Mapping, Sequence
from math import sqrt

__all__ = ["MOST_COVARIANCES", "WORDS", "explained_share", "explained_shares", "loadings"]

WORDS = {"weak": 0.1, "moderate": 0.3, "strong": 0.5}
"""Strengths in words, after Cohen (1988) for correlations; from memory."""
MOST_CAUSES = 200
"""Causes of one variable up to which its variance is added up."""
MOST_COVARIANCES = 60_000
"""Covariances worked out before the check gives up, after about a third of a second."""

Causes = Mapping[str, Mapping[str, float | None]]


def loadings(strength: float) -> tuple[float, float]:
    """Return the arrows of a hidden cause that induces this correlation: √|s|, sign(s)·√|s|.

    Examples
    --------
    >>> loadings(-0.25)
    (0.5, -0.5)
    """
    root = sqrt(abs(strength))
    return root, root if strength >= 0 else -root


def explained_shares(causes: Causes, order: Sequence[str]) -> dict[str, float | None]:
    """Return the share of each variable's variance that its causes explain, where that is known.

        explained_v = Σ_p Σ_q b_vp · b_vq · Cov(p, q)

    Parameters
    ----------
    causes
        For each variable the coefficient of each cause; None where it is unknown.
    order
        Every variable, causes before their effects.

    Returns
    -------
    dict
        Variables without a cause, or for which a coefficient that matters is unknown, are left out;
        None stands where it would take too long to say.
    """
    covariances = Covariances(causes, order)
    shares: dict[str, float | None] = {}
    for name in order:
        if causes[name] and None not in causes[name].values():
            share = share_of(name, causes, covariances)
            if share is not None or covariances.gave_up or len(causes[name]) > MOST_CAUSES:
                shares[name] = share
    return shares


def explained_share(causes: Causes, order: Sequence[str], name: str) -> float | None:
    """Return the share of one variable's variance that its causes explain.

    None where a coefficient that matters is unknown, or where it would take too long to say.
    """
    return share_of(name, causes, Covariances(causes, order))


def share_of(name: str, causes: Causes, covariances: "Covariances") -> float | None:
    """Return what causes with a coefficient explain of a variable; None where that is unknown."""
    known = [(cause, b) for cause, b in causes[name].items() if b is not None]
    if covariances.gave_up or len(known) > MOST_CAUSES:
        return None
    terms = [(b * c, covariances.between(p, q)) for p, b in known for q, c in known]
    if any(covariance is None for _, covariance in terms):
        return None
    return sum(product * (covariance or 0) for product, covariance in terms)


class Covariances:
    """Covariances of single pairs, worked out only where they are asked for."""

    def __init__(self, causes: Causes, order: Sequence[str]) -> None:
        self._causes = causes
        self._rank = {name: rank for rank, name in enumerate(order)}
        self._known: dict[tuple[str, str], float | None] = {}

    @property
    def gave_up(self) -> bool:
        """Whether there were too many to work out."""
        return len(self._known) > MOST_COVARIANCES

    def between(self, a: str, b: str) -> float | None:
        """Return Cov(a, b); None where a coefficient that it hangs on is unknown.

        With b the later of the two, Cov(a, b) = Σ over causes p of b of coefficient_p · Cov(a, p).
        The pairs that are still missing wait on a stack, since chains of causes can be long.
        """
        if a == b:
            return 1.0
        stack = [self._pair(a, b)]
        while stack:
            earlier, later = pair = stack[-1]
            if pair in self._known or self.gave_up:
                stack.pop()
                continue
            pairs = [self._pair(earlier, cause) for cause in self._causes[later]]
            missing = [each for each in pairs if each not in self._known and each[0] != each[1]]
            if missing:
                stack.extend(missing)
            else:
                self._known[pair] = self._sum(pairs, self._causes[later].values())
        return self._known.get(self._pair(a, b))

    def _pair(self, a: str, b: str) -> tuple[str, str]:
        return (a, b) if self._rank[a] <= self._rank[b] else (b, a)

    def _sum(
        self, pairs: Sequence[tuple[str, str]], coefficients: Iterable[float | None]
    ) -> float | None:
        total = 0.0
        for (a, b), coefficient in zip(pairs, coefficients, strict=True):
            covariance = 1.0 if a == b else self._known[a, b]
            if covariance == 0:
                continue
            if covariance is None or coefficient is None:
                return None
            total += coefficient * covariance
        return total

"""What no study below a node of the search can cost less than.

With n records, I bought and R undecided, a study that takes option k_j for each j ∈ R comes to at
least

    bought(n) + Σ_j cost_jk(n),    where    c ≥ κ² · (V / keep²)(N),   N = N₀ + Σ_j gain_jk,

κ² being design effect · K², and c the core of n: without degrees of freedom, one of which goes to
each j that is taken in. For λ ≥ 0 and μ ≥ 0 the inequality is weakened to

    bought(n) + λ (N₀ − room(n)) − μ · slack + Σ_j min_k (cost_jk(n) + λ gain_jk + μ bias_jk)  (1)

with room(n) the largest N that n records serve (what a degree of freedom takes off it is counted
among the gains), and slack what single readings may still add to the bias: Lagrange's relaxation,
which falls apart into one choice for each j. The study is on *some* number of records, so the bound
is the least over n of the largest over λ and μ. Where n can only be one of a few whole numbers each
is looked at, counts and batches rounded up. Else n runs through intervals: without rounding, (1) is
concave in n for fixed λ and μ (a sum of linear functions, of smallest ones of linear functions, and
of −λ·room, where room is linear or a square), and least at one of the ends.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from math import inf

import numpy as np

from costs.prices import MOST_RECORDS
from planner.bounds import Floor
from planner.joint.space import Space
from planner.joint.till import Floats
from planner.precision import FORGIVEN, ROUNDING

__all__ = ["Basket", "Bound", "Options", "Relaxation", "least_total"]

FEW = 12
"""Numbers of records that are looked at one by one."""
MULTIPLES = np.array([0.0, 0.35, 0.6, 0.8, 1.0, 1.25, 1.6, 2.2, 3.5])
"""λ as multiples of what one unit of N costs in records."""
BIAS_PRICES = np.array([0.0, 0.02, 0.06, 0.15, 0.3, 0.5, 0.8, 1.3, 2.5, 6.0])
"""μ as multiples of what an option costs at most, over what it adds to the bias at most."""
SAFE = 1e-9
"""Bounds are lowered by this part of themselves: more than all rounding errors together."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Options:
    """What each candidate can be read in, as padded arrays; option 0 is to leave it out."""

    setup: Floats
    per_unit: Floats
    loss: Floats
    needs: np.ndarray
    """Which components each option needs: candidates × options × purchases."""
    takes: Floats
    """What each option itself takes of each limited burden."""
    exists: np.ndarray
    worse: Floats
    """Error variance beyond the best way; ∞ for leaving out."""
    best: Floats

    @classmethod
    def of(cls, space: Space, nodes: tuple[int, ...]) -> "Options":
        """Return the options of some candidates."""
        most = 1 + max((len(space.ways[node]) for node in nodes), default=0)
        shape = (len(nodes), most)
        till = space.till
        setup, per_unit, loss = np.zeros(shape), np.zeros(shape), np.zeros(shape)
        needs = np.zeros((*shape, len(till.names)), dtype=bool)
        takes = np.zeros((*shape, len(space.limits)))
        exists = np.zeros(shape, dtype=bool)
        exists[:, 0] = True
        worse = np.full(shape, inf)
        best = np.array([space.noise[node][0] for node in nodes])
        for at, node in enumerate(nodes):
            for rank in range(len(space.ways[node])):
                row = till.rows[space.way_name(node, rank)]
                setup[at, rank + 1] = till.setup[row]
                per_unit[at, rank + 1] = till.per_unit[row]
                loss[at, rank + 1] = till.loss[row]
                needs[at, rank + 1] = till.needs[row]
                needs[at, rank + 1, row] = False
                takes[at, rank + 1] = space.takes[row]
                exists[at, rank + 1] = True
                worse[at, rank + 1] = space.noise[node][rank] - best[at]
        return cls(
            setup=setup,
            per_unit=per_unit,
            loss=loss,
            needs=needs,
            takes=takes,
            exists=exists,
            worse=worse,
            best=best,
        )


@dataclass(frozen=True, kw_only=True, slots=True)
class Basket:
    """What a node has bought, and what its undecided candidates would add."""

    bought: np.ndarray
    measured: int
    setup: Floats
    """Of each option, with a share of every component that it needs and others may too."""
    per_unit: Floats
    allowed: np.ndarray
    moves: np.ndarray
    """Whether an option changes how many units are started for each record."""

    @classmethod
    def of(
        cls,
        space: Space,
        options: Options,
        at: list[int],
        bought: np.ndarray,
        closed: np.ndarray,
        measured: int,
        forced: list[bool],
    ) -> "Basket":
        """Return the basket of a node.

        A component that is not bought yet is shared out evenly among the candidates that may need
        it: whoever is chosen, no more than its price is counted.

        Parameters
        ----------
        at
            The undecided candidates, as rows of the options.
        closed
            Components that are not bought below this node.
        forced
            Whether each of them cannot be left out.
        """
        till = space.till
        needs = options.needs[at] & ~bought
        allowed = options.exists[at] & ~(needs & closed).any(axis=2)
        taken = space.takes[bought].sum(axis=0)
        limits = np.array(list(space.limits.values()))
        if len(limits):
            more = needs @ space.takes + options.takes[at]
            allowed &= (taken + more <= limits * (1 + FORGIVEN)).all(axis=2)
        allowed[:, 0] = ~np.array(forced, dtype=bool)
        users = (needs & allowed[:, :, None]).any(axis=1).sum(axis=0)
        share = 1 / np.maximum(users, 1)
        each_unit = float(till.per_unit[bought].sum())
        setup = options.setup[at] + needs @ (till.setup * share)
        loss = options.loss[at] + needs @ (till.loss * share)
        per_unit = options.per_unit[at] + needs @ (till.per_unit * share) + loss * each_unit
        return cls(
            bought=bought,
            measured=measured,
            setup=setup,
            per_unit=per_unit,
            allowed=allowed,
            moves=loss > 0,
        )


@dataclass(frozen=True, slots=True)
class Bound:
    """What a node cannot undercut, and which choices come nearest to it."""

    total: float
    choice: np.ndarray
    """For each undecided candidate the option of the cheapest weakened study."""


def least_total(
    space: Space, floor: Floor, basket: Basket, reach: float | None, cutoff: float
) -> Bound:
    """Return what no study below a node costs less than.

    Parameters
    ----------
    reach
        K; None where the number of records is given.
    cutoff
        Studies as dear as this are of no interest: a bound above it may be too low.
    """
    nothing = np.zeros(len(basket.setup), dtype=int)
    if not basket.allowed.any(axis=1).all():
        return Bound(inf, nothing)
    if space.demand.records is not None:
        held = np.array([float(space.demand.records)])
        return Relaxation.of(space, floor, basket, held, exactly=True).least(None)
    assert reach is not None, "how good the estimate has to be is given"
    scale = space.design_effect * reach**2
    first, does_count = first_records(space, floor, basket, scale)
    if first > MOST_RECORDS:
        return Bound(inf, nothing)
    most = floor.least + float(np.where(basket.allowed, floor.increments, 0).max(axis=1).sum())
    core = float(np.ceil(scale * floor.variance(most) * (1 - SAFE)))
    final = max(first, core + basket.measured + 1 + does_count * len(nothing))
    last = max(first, min(final, affordable(space, basket, cutoff)))
    few = bool(last - first < FEW)
    records = np.arange(first, last + 1) if few else np.geomspace(first, last, FEW)
    relaxation = Relaxation.of(space, floor, basket, records, exactly=few)
    cores = records - basket.measured - 1
    found = [
        relaxation.least(form) for form in forms(floor, cores, scale, len(nothing) * does_count)
    ]
    best = max(found, key=lambda bound: bound.total)
    # From the final number of records on nobody is taken in for the sake of N.
    ends = np.array([final])
    if best.total <= float(space.till.total(basket.bought, ends)[0]) * (1 - SAFE):
        return best
    beyond = Relaxation.of(space, floor, basket, ends, exactly=True).least(None)
    return min(best, beyond, key=lambda bound: bound.total)


@dataclass(frozen=True, slots=True)
class Form:
    """One form of the bound on V / keep², by number of records."""

    room: Floats
    """What N may grow by."""
    widening: Floats
    """By how much one more record widens it."""
    taken: Floats
    """By how much whoever is taken in narrows it, since he takes a degree of freedom."""


def forms(floor: Floor, cores: Floats, scale: float, most: int) -> Iterator[Form]:
    """Return the linear form and that of the square root, as far as they say anything.

    Parameters
    ----------
    most
        How many may be taken in; 0 where that does not count. With t of them the core is c − t, and
        (c − t)² ≤ c² − t · (2c − most).
    """
    if floor.gamma > 0:
        wide = np.full(len(cores), 1 / (scale * floor.gamma))
        room = (cores / scale - floor.alpha) / floor.gamma
        yield Form(room - floor.least, wide, wide if most else 0 * wide)
    if floor.kappa > 0:
        unit = (scale * floor.kappa) ** 2
        taken = (2 * cores - most) / unit if most else 0 * cores
        yield Form(cores**2 / unit - floor.least, 2 * np.maximum(cores, 1) / unit, taken)


def first_records(space: Space, floor: Floor, basket: Basket, scale: float) -> tuple[float, bool]:
    """Return the least number of records, and whether it grows with the number of variables.

    It does not where something else decides on it.
    """
    core = float(np.ceil(scale * floor.variance(max(floor.least, 0.0)) * (1 - SAFE)))
    records = max(core, 1.0) + basket.measured + 1
    least = float(space.demand.at_least)
    if floor.strongest is not None and space.demand.least_f and floor.strongest > 0:
        asked = space.demand.least_f * space.design_effect / floor.strongest
        least = max(least, float(np.ceil(asked * (1 - SAFE))))
    return (least, False) if least > records else (records, True)


def affordable(space: Space, basket: Basket, cutoff: float) -> float:
    """Return the number of records beyond which what is bought alone reaches the cutoff."""
    per_unit = float(space.till.per_unit[basket.bought].sum())
    if cutoff == inf or not per_unit:
        return inf
    setup = float(space.till.setup[basket.bought].sum())
    kept = space.till.kept(basket.bought)
    return float(np.ceil((cutoff - setup) / per_unit * kept)) + 1


@dataclass(frozen=True, kw_only=True, slots=True)
class Relaxation:
    """(1) for some numbers of records, ready for any λ and μ."""

    fixed: Floats
    """By number of records."""
    slope: float
    """What one more record costs."""
    costs: Floats
    """By number of records, candidate and option; ∞ for what is not allowed."""
    gains: Floats
    biases: Floats | None
    """What each option adds to the bias; None where that is of no interest."""
    slack: float
    """What the bias may grow by."""
    exactly: bool
    """Each number by itself, counts and batches rounded up; else intervals between them."""

    @classmethod
    def of(
        cls, space: Space, floor: Floor, basket: Basket, records: Floats, *, exactly: bool
    ) -> "Relaxation":
        """Return what (1) is made of."""
        till, bought = space.till, basket.bought
        kept = till.kept(bought)
        slope = float(till.per_unit[bought].sum()) / kept
        costs = basket.setup + basket.per_unit * (records / kept)[:, None, None]
        fixed: Floats = float(till.setup[bought].sum()) + slope * records
        if exactly:
            # What rounding up adds is sure only while the number of units started stays the same.
            rounded = till.total(bought, records)
            costs -= (rounded - fixed)[:, None, None] * basket.moves
            fixed = rounded
        biases = None
        if floor.more_bias is not None:
            is_some = basket.allowed & (floor.more_bias > ROUNDING)
            biases = np.where(is_some, floor.more_bias, 0)
        return cls(
            fixed=fixed,
            slope=slope,
            costs=np.where(basket.allowed, costs, inf),
            gains=np.where(basket.allowed, floor.increments, 0),
            biases=biases if biases is not None and biases.any() else None,
            slack=space.demand.bias * (1 + 2 * FORGIVEN) + FORGIVEN - floor.decided_bias,
            exactly=exactly,
        )

    def least(self, form: Form | None) -> Bound:
        """Return the least over c of the largest over λ, then over μ, of (1).

        Parameters
        ----------
        form
            What N may grow by; None where N is of no interest.
        """
        nothing = np.zeros(len(self.fixed))
        prices = nothing[:, None]
        if form is None:
            form = Form(nothing, nothing, nothing)
        else:
            prices = (self.slope / form.widening)[:, None] * MULTIPLES
        rates: Floats = np.zeros(1)
        bounds = self.bounds(prices, rates, form)
        if self.biases is not None:
            best = bounds.argmax(axis=1)
            best = best if self.exactly else np.append(best, best[-1])
            prices = np.take_along_axis(prices, best[:, None], axis=1)
            prices = np.repeat(prices, len(BIAS_PRICES), axis=1)
            rates = self.worth_of_bias() * BIAS_PRICES
            bounds = self.bounds(prices, rates, form)
        largest = bounds.max(axis=1)
        at = int(largest.argmin())
        total, best_price = float(largest[at]), int(bounds[at].argmax())
        rate = rates if len(rates) == 1 else rates[best_price, None]
        charged = self.charged(np.array([at]), prices[at : at + 1, best_price, None], rate, form)
        return Bound(total * (1 - SAFE) if total > 0 else 0.0, charged[0, 0].argmin(axis=1))

    def bounds(self, prices: Floats, rates: Floats, form: Form) -> Floats:
        """Return (1) for each number of records, or for each interval at its worse end."""
        every = np.arange(len(self.fixed))
        values = self.values(every, prices, rates, form)
        if self.exactly:
            return values
        right = self.values(every[1:], prices[:-1], rates, form)
        worse: Floats = np.minimum(values[:-1], right)
        return worse

    def values(self, at: np.ndarray, prices: Floats, rates: Floats, form: Form) -> Floats:
        """Return (1) for some numbers of records: numbers × pairs of λ and μ."""
        charged = self.charged(at, prices, rates, form)
        slack = self.slack if self.biases is not None else 0.0
        found: Floats = (
            charged.min(axis=3).sum(axis=2)
            + self.fixed[at, None]
            - prices * form.room[at, None]
            - rates * slack
        )
        return found

    def charged(self, at: np.ndarray, prices: Floats, rates: Floats, form: Form) -> Floats:
        """Return cost + λ · gain + μ · bias: numbers × pairs × candidates × options."""
        charged: Floats = self.costs[at, None] + self.gains * prices[:, :, None, None]
        charged[..., 1:] += (prices * form.taken[at, None])[:, :, None, None]
        if self.biases is not None:
            charged = charged + self.biases * rates[:, None, None]
        return charged

    def worth_of_bias(self) -> float:
        """Return what an option costs at most, over what it adds to the bias at most."""
        assert self.biases is not None, "bias is of interest"
        finite = self.costs[0][self.costs[0] < inf]
        return (float(finite.max(initial=0.0)) + 1e-9) / float(self.biases.max())

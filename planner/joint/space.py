"""What there is to decide for one claim: who plays a part, read in which way; and what it is worth.

A draft is a complete decision. ``weigh`` works out what it comes to in floating point, ``settle``
in exact money; both know no bounds and no search.
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from fractions import Fraction
from functools import cached_property
from math import ceil, inf

import numpy as np

from costs.bill import Bill, bill_for
from costs.prices import MOST_RECORDS, WayName
from costs.tally import Tally
from planner.claims import Claim, Roles
from planner.joint.till import Till
from planner.precision import (
    FORGIVEN,
    LEAST_KEEP,
    ROUNDING,
    Demand,
    Estimate,
    Parts,
    Precision,
    as_read,
    bias_of,
    forgiving_ceil,
    keep_of,
    precision_of,
)
from planner.program import Within
from planner.routes import ROUTES, Route

__all__ = ["Draft", "Settled", "Space", "Worth"]


@dataclass(frozen=True, slots=True)
class Draft:
    """Who plays which part, and in which of its ways each variable is read."""

    roles: Roles
    ways: tuple[tuple[int, int], ...]
    """Nodes with the rank of their way, treatment and outcome among them, sorted."""

    @classmethod
    def of(cls, roles: Roles, ways: Mapping[int, int]) -> "Draft":
        """Return a draft; ways of nobody who plays a part are left out."""
        return cls(roles, tuple(sorted(ways.items())))


@dataclass(frozen=True, slots=True)
class Worth:
    """What a draft comes to, in floating point."""

    wrong: float
    """By what part limits are overstepped, in all; 0 where none is."""
    score: float
    """What is minimised: money, or the squared half-width that the money buys."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Settled:
    """A draft within all limits, with its exact bill."""

    draft: Draft
    bill: Bill
    score: Fraction | float
    key: tuple[object, ...]
    """What decides between two drafts: the score, money, fewer variables, smaller names."""


# No slots: what is worked out once is kept beside the fields.
@dataclass(frozen=True, kw_only=True)
class Space:
    """One claim, and all that stays the same while its cheapest study is looked for."""

    claim: Claim
    within: Within
    demand: Demand
    till: Till
    rows: Mapping[int, int]
    """The row of each node in the covariance matrix."""
    ways: Mapping[int, tuple[str, ...]]
    """The ways of each measurable node, better readings first, then smaller names."""
    noise: Mapping[int, tuple[float, ...]]
    """The error variance of each of them: 1/reliability − 1."""
    grid: float
    """Totals that differ, differ by this at least."""
    known: dict[Draft, Worth] = field(default_factory=dict)
    """What drafts have turned out to be worth."""

    @classmethod
    def of(cls, claim: Claim, within: Within, till: Till) -> "Space":
        """Return the space of a claim."""
        assert within.demand is not None, "without a demand there is nothing to weigh"
        ways, noise, rows = {}, {}, {}
        for name, named in within.prices.ways.items():
            node = claim.diagram.numbers[name]
            order = sorted(named, key=lambda way: (-named[way].reliability, way))
            ways[node] = tuple(order)
            noise[node] = tuple(float(1 / named[way].reliability) - 1 for way in order)
            if name in within.demand.rows:
                rows[node] = within.demand.rows[name]
        return cls(
            claim=claim,
            within=within,
            demand=within.demand,
            till=till,
            rows=rows,
            ways=ways,
            noise=noise,
            grid=float(Tally.of(within.prices, within.terms).unit * within.terms.surcharge),
        )

    @cached_property
    def route(self) -> Route:
        """The route of the claim."""
        return ROUTES[self.claim.route]

    @cached_property
    def design_effect(self) -> float:
        """By what records are multiplied on this route."""
        return self.demand.design_effect(self.claim.route)

    def parts(self, roles: Roles) -> Parts:
        """Return the rows of those who play a part."""

        def row(nodes: Iterable[int]) -> tuple[int, ...]:
            return tuple(self.rows[node] for node in sorted(nodes))

        return Parts(
            x=self.rows[self.claim.treatment],
            y=self.rows[self.claim.outcome],
            w=row(roles.covariates),
            z=row(roles.instruments),
            m=row(roles.mediators),
        )

    def errors(self, ways: Iterable[tuple[int, int]]) -> dict[int, float]:
        """Return the error variance of each reading, by row."""
        return {self.rows[node]: self.noise[node][rank] for node, rank in ways}

    def way_name(self, node: int, rank: int) -> WayName:
        """Return the name of a way."""
        return self.claim.diagram.names[node], self.ways[node][rank]

    def estimate(self, draft: Draft) -> Estimate:
        """Return what the estimate of a draft does on many records."""
        errors = self.errors(draft.ways)
        rows = sorted(errors)
        at = {row: place for place, row in enumerate(rows)}
        read = as_read(
            self.demand.sigma[np.ix_(rows, rows)], {at[row]: e for row, e in errors.items()}
        )
        return self.route.precision.estimate(read, self.parts(draft.roles).renumbered(at))

    def bias(self, draft: Draft) -> tuple[float, dict[int, float]]:
        """Return the bias bound of a draft, and its sources by row."""
        return bias_of(
            self.route.precision,
            self.demand.sigma,
            self.parts(draft.roles),
            self.errors(draft.ways),
            self.demand.effect,
        )

    # ------------------------------------------------------------------------------ how many

    def core(self, estimate: Estimate, reach: float) -> float:
        """Return what ``records`` is before degrees of freedom: design effect · V · (K/keep)²."""
        keep = keep_of(estimate.limit, self.demand.effect)
        if keep < LEAST_KEEP:
            return inf
        return self.design_effect * estimate.variance * (reach / keep) ** 2

    def records(self, estimate: Estimate, measured: int) -> int | None:
        """Return how many records a draft needs; None where it is out of reach."""
        if self.demand.records is not None:
            return self.demand.records
        assert self.demand.reach is not None, "how wide or how many is given"
        needed = self.core(estimate, self.demand.reach)
        if needed > MOST_RECORDS:
            return None
        records = max(
            forgiving_ceil(needed) + measured + 1,
            self.least_records(estimate),
            self.demand.at_least,
        )
        return records if records <= MOST_RECORDS else None

    def least_records(self, estimate: Estimate) -> int:
        """Return the records that the floor of the first-stage F asks for; 0 without a floor."""
        if estimate.strength is None or not self.demand.least_f:
            return 0
        if estimate.strength <= 0:
            return MOST_RECORDS + 1
        needed = self.demand.least_f * self.design_effect / estimate.strength
        return forgiving_ceil(min(needed, 2.0 * MOST_RECORDS))

    # --------------------------------------------------------------------------------- worth

    def is_valid(self, roles: Roles) -> bool:
        """Say whether the roles open the route."""
        return self.route.is_valid(self.claim, roles)

    def weigh(self, draft: Draft) -> Worth:
        """Return what a valid draft comes to."""
        if draft not in self.known:
            self.known[draft] = self._weighed(draft)
        return self.known[draft]

    def _weighed(self, draft: Draft) -> Worth:
        demand, measured = self.demand, len(draft.ways)
        estimate = self.estimate(draft)
        bought = self.bought(draft)
        wrong = self.burdened(bought)
        if demand.bias < inf:
            wrong += overstep(self.bias(draft)[0], demand.bias)
        if demand.spend is not None:
            records = self.affordable(bought)
            if records <= measured + 1:
                return Worth(inf, inf)
            score = self.core(estimate, 1.0) / (records - measured - 1)
            wrong += overstep(self.least_records(estimate), records)
            return Worth(wrong, score)
        count = self.records(estimate, measured)
        if count is None:
            return Worth(inf, inf)
        total = float(self.till.total(bought, np.array([float(count)]))[0])
        if demand.records is not None:
            wrong += overstep(self.least_records(estimate), count)
            wrong += overstep(measured + 2, count)
        if self.within.frame_size is not None:
            wrong += overstep(count / self.till.kept(bought), self.within.frame_size)
        if self.within.budget is not None:
            wrong += overstep(total, float(self.within.budget))
        return Worth(wrong, total)

    def bought(self, draft: Draft) -> np.ndarray:
        """Return what a draft buys, as rows of the till."""
        names = [self.way_name(node, rank) for node, rank in draft.ways]
        found: np.ndarray = self.always | self.till.closure(names)
        return found

    @cached_property
    def always(self) -> np.ndarray:
        """What every plan buys, as rows of the till."""
        components = self.within.prices.components
        names = [name for name, component in components.items() if component.always]
        found: np.ndarray = (
            self.till.closure(names) if names else np.zeros(len(self.till.names), dtype=bool)
        )
        return found

    @cached_property
    def takes(self) -> np.ndarray:
        """What each purchase takes of each burden that has a limit."""
        rows = [
            [
                float(self.within.prices.purchase(name).takes.get(burden, 0))
                for burden in self.limits
            ]
            for name in self.till.names
        ]
        return np.array(rows).reshape(len(self.till.names), len(self.limits))

    @cached_property
    def limits(self) -> dict[str, float]:
        """The burdens that have a limit."""
        burdens = self.within.terms.burdens
        return {name: float(b.limit) for name, b in burdens.items() if b.limit is not None}

    def burdened(self, bought: np.ndarray) -> float:
        """Return by what part the limits of burdens are overstepped."""
        taken = self.takes[bought].sum(axis=0)
        return sum(
            overstep(float(amount), limit)
            for amount, limit in zip(taken, self.limits.values(), strict=True)
        )

    def affordable(self, bought: np.ndarray) -> int:
        """Return about the most records that the money and the frame allow; for a first look."""
        money = self.money()
        setup = float(self.till.setup[bought].sum())
        per_unit = float(self.till.per_unit[bought].sum())
        kept = self.till.kept(bought)
        most = (money - setup) / per_unit * kept if per_unit else inf
        if self.within.frame_size is not None:
            most = min(most, self.within.frame_size * kept)
        return int(max(0.0, min(most, float(MOST_RECORDS))))

    def money(self) -> float:
        """Return the money that may be spent."""
        allowed = [inf if self.demand.spend is None else self.demand.spend]
        if self.within.budget is not None:
            allowed.append(float(self.within.budget))
        return min(allowed)

    # ---------------------------------------------------------------------------- exact money

    def bill(self, draft: Draft, records: int) -> Bill:
        """Return the exact bill on so many records: treatment, outcome, then others by name."""
        names = self.claim.diagram.names
        ends = [self.claim.treatment, self.claim.outcome]
        ways = dict(draft.ways)
        others = sorted((node for node in ways if node not in ends), key=names.__getitem__)
        chosen = [self.way_name(node, ways[node]) for node in [*ends, *others]]
        terms = replace(self.within.terms, records=records)
        return bill_for(chosen, self.within.prices, terms)

    def settle(self, draft: Draft) -> Settled | None:
        """Return a valid draft with its exact bill; None where it oversteps a limit."""
        estimate, measured = self.estimate(draft), len(draft.ways)
        if self.demand.spend is not None:
            records = self.most_records(draft, measured)
        else:
            records = self.records(estimate, measured)
        if records is None or records <= measured + 1 or records < self.least_records(estimate):
            return None
        bill = self.bill(draft, records)
        if self.within.broken(bill):
            return None
        if self.demand.bias < inf and overstep(self.bias(draft)[0], self.demand.bias):
            return None
        score: Fraction | float = bill.total
        if self.demand.spend is not None:
            core = self.core(estimate, 1.0)
            if core == inf:
                return None
            # Twelve digits, so that a tie is one whatever the order of sums.
            score = float(f"{core / (records - measured - 1):.11e}")
        return Settled(draft=draft, bill=bill, score=score, key=self.key(draft, bill, score))

    def most_records(self, draft: Draft, measured: int) -> int | None:
        """Return the most records that the money and the frame allow, exactly."""
        assert self.demand.spend is not None, "money is given"
        spend = self.within.spend
        assert spend is not None, "money is given"

        def fits(records: int) -> bool:
            bill = self.bill(draft, records)
            return bill.total <= spend and not self.within.broken(bill)

        low, high = measured + 1, measured + 2
        while high <= MOST_RECORDS and fits(high):
            low, high = high, min(2 * high, MOST_RECORDS + 1)
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if fits(middle) else (low, middle)
        return low if low > measured + 1 else None

    def key(self, draft: Draft, bill: Bill, score: Fraction | float) -> tuple[object, ...]:
        """Return what decides between two drafts."""
        names = self.claim.diagram.names
        ways = {names[node]: rank for node, rank in draft.ways}
        roles = draft.roles
        return (
            score,
            bill.total,
            len(ways),
            sorted(ways),
            [ways[name] for name in sorted(ways)],
            sorted(names[node] for node in roles.instruments),
            sorted(names[node] for node in roles.mediators),
        )

    def precision(self, settled: Settled) -> Precision:
        """Return what a plan achieves, in the units of the answer."""
        draft, demand, scale = settled.draft, self.demand, self.demand.scale
        estimate = self.estimate(draft)
        bound, singles = self.bias(draft)
        records, measured = settled.bill.records, len(draft.ways)
        half_width, power, coverage = precision_of(
            estimate, demand, self.design_effect, records=records, measured=measured
        )
        nodes = {self.rows[node]: (node, rank) for node, rank in draft.ways}
        strength = estimate.strength
        return Precision(
            effect=demand.effect * scale,
            limit=float(estimate.limit) * scale,
            variance=float(estimate.variance) * scale**2,
            bias_bound=float(bound),
            bias_sources={
                ".".join(self.way_name(*nodes[row])): float(share)
                for row, share in sorted(singles.items(), key=lambda pair: -pair[1])
                if share > ROUNDING
            },
            half_width=float(half_width * scale),
            power=power,
            coverage=coverage,
            first_stage_f=None
            if strength is None
            else float(records / self.design_effect * strength),
        )


def overstep(number: float, most: float) -> float:
    """Return by what part of itself a limit is overstepped, rounding errors forgiven."""
    if number <= most * (1 + FORGIVEN) + ROUNDING:
        return 0.0
    return (number - most) / most if most > 0 else ceil(number)

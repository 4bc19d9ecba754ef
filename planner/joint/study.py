"""The joint search from beginning to end, and what can be said of the study that it finds."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from math import inf, prod

from costs.bill import Bill
from costs.prices import MOST_RECORDS
from planner.claims import Claim, Roles
from planner.deadline import Deadline, Tell, tell_nobody
from planner.joint.branch import Branching, Search
from planner.joint.opening import downhill
from planner.joint.space import Draft, Settled, Space
from planner.joint.till import Till
from planner.precision import Precision, forgiving_ceil
from planner.program import Choice, Found, NothingFound, Within, cheapest_purchase
from planner.routes import ROUTES

__all__ = ["Extra", "JointStudy", "cheapest_study", "weighed_up"]

EXACT_TIES = 12
"""Up to so many measurable variables ties are resolved to the last name."""
OPENING_SHARE = 0.25
"""The part of the time that may go into a study to begin with."""
SMALL = 20_000
"""Ways of measuring everything or leaving it out, up to which the search needs no opening."""
GUESSED_RECORDS = 400
"""For the integer program, where nothing better is known."""


@dataclass(frozen=True, slots=True)
class Extra:
    """Somebody that validity does not need, and what he is there for."""

    node: int
    saves: Fraction | None
    """What the same precision would cost more without him; None where a limit would break."""


@dataclass(frozen=True, kw_only=True, slots=True)
class JointStudy:
    """A study with its precision, and how sure it is that none is better."""

    claim: Claim
    roles: Roles
    bill: Bill
    precision: Precision
    extras: tuple[Extra, ...]
    bound: Fraction
    """No study costs less (or, where money is given, leads to the same precision for less)."""
    narrowest: float | None
    """Where money is given: no study has a smaller half-width."""


def cheapest_study(
    claims: Sequence[Claim],
    within: Within,
    deadline: Deadline,
    tell: Tell = tell_nobody,
    hint: Found | None = None,
) -> JointStudy | NothingFound:
    """Return the cheapest study with which one of the claims comes true, sized to the demand.

    Parameters
    ----------
    hint
        What the integer program bought at fixed records; where None it is asked.
    """
    till = Till.of(within.prices, within.terms)
    spaces = {claim.route: Space.of(claim, within, till) for claim in claims}
    search = Search(deadline, ties=len(within.prices.ways) <= EXACT_TIES, tell=tell)
    for draft, space in opening_drafts(spaces, within, deadline, hint):
        opening = Deadline(deadline.left * OPENING_SHARE)
        search.offer(space, downhill(space, draft, opening))
    bound = search.run([Branching(space) for space in spaces.values()])
    if search.best is None:
        return NothingFound(proved=bound == inf)
    return told(*search.best, bound)


def opening_drafts(
    spaces: Mapping[str, Space], within: Within, deadline: Deadline, hint: Found | None
) -> Iterator[tuple[Draft, Space]]:
    """Return valid drafts: whoever opens each route, best read; and what the program would buy."""
    records = within.demand.records if within.demand else None
    for space in spaces.values():
        claim = space.claim
        roles = space.route.criterion.opening(claim, frozenset(space.ways))
        if roles is not None and claim.ends <= space.ways.keys():
            draft = Draft.of(roles, dict.fromkeys(roles.nodes | claim.ends, 0))
            if records is None and space.demand.reach is not None:
                records = space.records(space.estimate(draft), len(draft.ways))
            yield draft, space
    if hint is None and any(is_large(space) for space in spaces.values()):
        hint = asked(spaces, within, records or GUESSED_RECORDS, deadline)
    if hint is not None:
        for claim, roles in hint.opened:
            if claim.route in spaces:
                space = spaces[claim.route]
                yield draft_of(space, roles, dict(hint.bill.ways)), space


def is_large(space: Space) -> bool:
    """Say whether the integer program is worth its while: it takes as long as some 50 nodes."""
    sets = prod(1 + len(ways) for ways in space.ways.values())
    return sets > SMALL


def asked(
    spaces: Mapping[str, Space], within: Within, records: int, deadline: Deadline
) -> Found | None:
    """Return what the integer program buys for so many records, precision left aside."""
    found = cheapest_purchase(
        [Choice(tuple(space.claim for space in spaces.values()))],
        replace(within, terms=replace(within.terms, records=records)),
        lambda program, claim, measurable, opens: ROUTES[claim.route].rows.write_rows(
            program, claim, measurable, opens
        ),
        deadline.left * OPENING_SHARE,
    )
    return None if isinstance(found, NothingFound) else found


def draft_of(space: Space, roles: Roles, ways: Mapping[str, str]) -> Draft:
    """Return roles with named ways as a draft."""
    names = space.claim.diagram.names
    ranks = {
        node: space.ways[node].index(ways[names[node]]) for node in roles.nodes | space.claim.ends
    }
    return Draft.of(roles, ranks)


def weighed_up(
    claim: Claim, roles: Roles, ways: Mapping[str, str], within: Within, bound: Fraction
) -> JointStudy | None:
    """Return what a plan on a fixed number of records achieves; None if it is not good enough."""
    space = Space.of(claim, within, Till.of(within.prices, within.terms))
    settled = space.settle(draft_of(space, roles, ways))
    if settled is None:
        return None
    return replace(told(space, settled, inf), bound=min(bound, settled.bill.total))


def told(space: Space, settled: Settled, bound: float) -> JointStudy:
    """Return all there is to say of the best study."""
    total, is_money_given = settled.bill.total, space.demand.spend is not None
    precision = space.precision(settled)
    narrowest = None
    if is_money_given:
        share = 1.0 if bound == inf else min(1.0, (bound / float(settled.score)) ** 0.5)
        narrowest = precision.half_width * share
    lower = total
    if bound < inf:
        lower = Fraction(0) if is_money_given else min(total, Fraction(bound))
    return JointStudy(
        claim=space.claim,
        roles=settled.draft.roles,
        bill=settled.bill,
        precision=precision,
        extras=tuple(extras(space, settled)),
        bound=lower,
        narrowest=narrowest,
    )


def extras(space: Space, settled: Settled) -> Iterator[Extra]:
    """Return those without whom the roles stay valid, and what each saves."""
    roles = settled.draft.roles
    for node in space.claim.diagram.by_name(roles.nodes):
        fewer = roles.without(node)
        if space.is_valid(fewer):
            ways = {each: rank for each, rank in settled.draft.ways if each != node}
            yield Extra(node, saved(space, settled, Draft.of(fewer, ways)))


def saved(space: Space, settled: Settled, without: Draft) -> Fraction | None:
    """Return what the same precision costs more without somebody; None where a limit breaks."""
    if space.demand.spend is None:
        other = space.settle(without)
        return None if other is None else other.bill.total - settled.bill.total
    if space.weigh(without).wrong:
        return None
    estimate, measured = space.estimate(without), len(without.ways)
    core = space.core(estimate, 1.0) / float(settled.score)
    if core > MOST_RECORDS:
        return None
    records = max(forgiving_ceil(core) + measured + 1, space.least_records(estimate))
    return space.bill(without, records).total - settled.bill.total

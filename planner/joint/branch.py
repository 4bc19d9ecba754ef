"""Branch and bound for one claim or several: the cheapest study, with a proof or an honest gap.

A node decides, in this order: how treatment and outcome are read, and the instrument and its way
(these span the roots); every mediator; which shared components are bought at all; every covariate.
The node with the lowest bound is taken first, so that the bound of the next one is a bound on all
that is left. A node is dropped when its bound reaches the best study so far, when no valid set lies
between what it includes and what it has left (the ancestral argument of the criteria), or when no
plan below it can keep a limit.
"""

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from heapq import heappop, heappush
from itertools import count, product
from math import inf

import numpy as np

from planner.bounds import Floor, Sight
from planner.claims import Roles, Separation
from planner.deadline import Deadline, Tell, tell_nobody
from planner.diagram import Nodes
from planner.joint.opening import downhill
from planner.joint.purse import Basket, Bound, Options, least_total
from planner.joint.space import Draft, Settled, Space
from planner.precision import FORGIVEN

__all__ = ["Branching", "Node", "Search"]

BEGINNINGS = 3
"""Roots from whose rounded drafts the search goes downhill before anything else."""
IMPROVING_SHARE = 0.1
MOST_FORCED = 80
"""Candidates up to which it is asked for each whether anything does without."""
TELL_AFTER = 100
"""Nodes between two words on how far the search has come."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Node:
    """A partial decision."""

    ways: tuple[tuple[int, int], ...]
    """Who is measured, with the rank of the way, in the order of deciding."""
    roles: Roles
    undecided: tuple[int, ...]
    """Candidates for covariates."""
    open_mediators: tuple[int, ...] = ()
    opened: tuple[int, ...] = ()
    closed: tuple[int, ...] = ()
    """Components, as rows of the till, that are bought in any case, and that are not."""
    forced: frozenset[int] = frozenset()
    """Candidates without which nothing below is valid."""
    closing: tuple[int, ...] = ()
    """Candidates that close what is still open."""
    bound: float = 0.0
    next: int | None = None
    """The candidate, or (below zero) the component, to decide on; None at a leaf."""
    rounded: Draft | None = None
    """A valid draft that comes near to the bound."""


class Branching:
    """How the nodes of one claim are made and bounded."""

    def __init__(self, space: Space) -> None:
        self.space = space
        claim = space.claim
        measurable = frozenset(space.ways)
        self.measurable = measurable
        able = space.route.criterion.candidates(claim, measurable)
        before = claim.before(measurable)
        self.covariates = tuple(sorted(before))
        self.mediators = tuple(sorted(able.mediators))
        self.instruments = tuple(sorted(able.instruments))
        self.options = Options.of(space, self.covariates)
        self.at = {node: row for row, node in enumerate(self.covariates)}
        self._separations: dict[tuple[Nodes, Nodes], tuple[Separation, ...]] = {}
        prices = space.within.prices
        self.components = [space.till.rows[name] for name in prices.components]

    # --------------------------------------------------------------------------------- roots

    def roots(self) -> Iterator[Node]:
        """Return the nodes on which treatment, outcome and instrument are decided."""
        space, claim = self.space, self.space.claim
        # Without somebody essential, whom a limit may have taken away, there is nothing to decide.
        able = claim.ends <= space.ways.keys()
        if not able or space.route.criterion.opening(claim, self.measurable) is None:
            return
        ends = [
            [(node, rank) for rank in range(len(space.ways[node]))]
            for node in (claim.treatment, claim.outcome)
        ]
        heads: list[list[tuple[int, int]]] = [[]]
        if self.instruments:
            heads = [[(z, rank)] for z in self.instruments for rank in range(len(space.ways[z]))]
        for x, y, head in product(ends[0], ends[1], heads):
            roles = Roles(instruments=frozenset(node for node, _ in head))
            node = Node(
                ways=(x, y, *head),
                roles=roles,
                undecided=tuple(each for each in self.covariates if each not in roles.instruments),
                open_mediators=self.mediators,
            )
            if self.can_open(node):
                yield self.with_forced(node, node.undecided)

    # ------------------------------------------------------------------------------ validity

    def separations(self, roles: Roles) -> tuple[Separation, ...]:
        """Return what must be closed, for these instruments and mediators without covariates."""
        key = roles.instruments, roles.mediators
        if key not in self._separations:
            bare = replace(roles, covariates=frozenset())
            self._separations[key] = self.space.route.criterion.separations(self.space.claim, bare)
        return self._separations[key]

    def can_open(self, node: Node, without: int | None = None) -> bool:
        """Say whether some set between what is included and what is left may be valid.

        If any set of nodes between I and I ∪ R closes all paths between two groups A and B, the
        ancestors of A, B and I among I ∪ R do. Each separation is asked by itself; where a route
        has two, the answer may be yes without a set that does for both.
        """
        claim = self.space.claim
        left = frozenset(node.undecided) - {without}
        if node.open_mediators or node.roles.mediators or self.mediators:
            carriers = node.roles.mediators | set(node.open_mediators)
            if not carriers:
                return False
            if claim.diagram.directed_path(claim.treatment, {claim.outcome}, carriers):
                return False
            if node.open_mediators:
                return True
        for each in self.separations(node.roles):
            given = each.given | node.roles.covariates
            near = each.diagram.ancestors(each.starts | each.ends | given)
            if not each.diagram.are_separated(each.starts, each.ends, given | (left & near)):
                return False
        return True

    def with_forced(self, node: Node, among: Iterable[int]) -> Node:
        """Return a node that knows which candidates nothing below can do without.

        Further down there are fewer sets to choose from, so whoever is forced stays so.
        """
        if node.open_mediators or len(self.covariates) > MOST_FORCED:
            return node
        asked = [each for each in among if each in node.undecided and each not in node.forced]
        found = {each for each in asked if not self.can_open(node, without=each)}
        return replace(node, forced=node.forced | found) if found else node

    # -------------------------------------------------------------------------------- bounds

    def sight(self, node: Node) -> Sight:
        """Return what is known at a node."""
        space = self.space
        at = [self.at[each] for each in node.undecided]
        noise = space.errors(node.ways)
        noise |= {space.rows[m]: space.noise[m][0] for m in node.open_mediators}
        return Sight(
            sigma=space.demand.sigma,
            effect=space.demand.effect,
            parts=space.parts(node.roles),
            noise=noise,
            undecided=tuple(space.rows[each] for each in node.undecided),
            best=self.options.best[at],
            worse=self.options.worse[at],
            forced=frozenset(space.rows[each] for each in node.forced & set(node.undecided)),
            open_mediators=tuple(space.rows[m] for m in node.open_mediators),
            with_bias=space.demand.bias < inf,
        )

    def basket(self, node: Node) -> Basket:
        """Return what a node has bought."""
        space = self.space
        bought = space.always | space.till.closure(space.way_name(*way) for way in node.ways)
        for row in node.opened:
            bought = bought | space.till.needs[row]
        closed = np.zeros(len(bought), dtype=bool)
        closed[list(node.closed)] = True
        at = [self.at[each] for each in node.undecided]
        forced = [each in node.forced for each in node.undecided]
        return Basket.of(space, self.options, at, bought, closed, len(node.ways), forced)

    def bounded(self, node: Node, search: "Search") -> Node | None:
        """Return a node with its bound and what to decide next; None if it can be dropped."""
        basket = self.basket(node)
        if basket.bought[list(node.closed)].any() or self.space.burdened(basket.bought):
            return None
        floor = self.space.route.bounds.floor(self.sight(node))
        if self.is_hopeless(floor, basket):
            return None
        bound = search.bound(self.space, floor, basket, node.bound)
        if bound is None:
            return None
        return replace(
            node,
            bound=bound.total,
            next=self.next_of(node, floor, basket),
            rounded=search.round_off(self, node, bound),
            closing=self.closers(node, floor),
        )

    def is_hopeless(self, floor: Floor, basket: Basket) -> bool:
        """Say whether no plan below can keep the limits, whatever it costs."""
        demand = self.space.demand
        bias = max(floor.bias, floor.decided_bias + least_more(floor, basket))
        is_out_of_reach = floor.is_dead and demand.records is None
        if is_out_of_reach or bias > demand.bias * (1 + 2 * FORGIVEN) + FORGIVEN:
            return True
        if demand.records is None:
            return False
        if demand.records <= basket.measured + 1:
            return True
        strongest = inf if floor.strongest is None else floor.strongest
        reached = strongest * demand.records / self.space.design_effect
        return reached < demand.least_f * (1 - 2 * FORGIVEN)

    @staticmethod
    def closers(node: Node, floor: Floor) -> tuple[int, ...]:
        """Return the candidates that close what is still open."""
        if floor.closing is None:
            return ()
        return tuple(
            each for each, share in zip(node.undecided, floor.closing, strict=True) if share > 0
        )

    def next_of(self, node: Node, floor: Floor, basket: Basket) -> int | None:
        """Return what to decide next.

        A mediator; a candidate that closes what is open; a component; then the candidate that
        widens the ranges most, and a little by what would be lost without it: that much the
        relaxation knows by itself.
        """
        if node.open_mediators:
            return node.open_mediators[0]
        if not node.undecided:
            return None
        if floor.closing is not None and floor.closing.max() > 0:
            return node.undecided[int(np.argmax(floor.closing))]
        component = self.shared(node, basket)
        if component is not None:
            return ~component
        lost = np.where(basket.allowed[:, 0], floor.increments[:, 0], 0) / floor.least
        return node.undecided[int(np.argmax(0.1 * lost + floor.related**0.5))]

    def shared(self, node: Node, basket: Basket) -> int | None:
        """Return the dearest component that is undecided and that several candidates may need."""
        at = [self.at[each] for each in node.undecided]
        needs = (self.options.needs[at] & basket.allowed[:, :, None]).any(axis=1).sum(axis=0)
        till = self.space.till
        open_ones = [
            row
            for row in self.components
            if needs[row] > 1
            and not basket.bought[row]
            and (till.setup[row] > 0 or till.per_unit[row] > 0)
        ]
        return max(
            open_ones, key=lambda row: (till.setup[row], till.per_unit[row], -row), default=None
        )

    # ------------------------------------------------------------------------------ children

    def children(self, node: Node) -> Iterator[Node]:
        """Return the nodes that a node falls into."""
        decide = node.next
        assert decide is not None, "a leaf has no children"
        if decide < 0:
            component = ~decide
            yield replace(node, closed=(*node.closed, component))
            yield replace(node, opened=(*node.opened, component))
            return
        left = tuple(each for each in node.undecided if each != decide)
        waiting = tuple(each for each in node.open_mediators if each != decide)
        is_mediator = decide in node.open_mediators
        without = replace(node, undecided=left, open_mediators=waiting)
        if self.can_open(without):
            # Where a mediator has just been decided on, nothing is known of the candidates yet.
            among = left if is_mediator else node.closing
            yield self.with_forced(without, among)
        roles = node.roles
        part = frozenset((decide,))
        roles = (
            replace(roles, mediators=roles.mediators | part)
            if is_mediator
            else replace(roles, covariates=roles.covariates | part)
        )
        chosen = replace(without, roles=roles)
        if self.can_open(chosen):
            chosen = self.with_forced(chosen, left if is_mediator else ())
            for rank in range(len(self.space.ways[decide])):
                yield replace(chosen, ways=(*node.ways, (decide, rank)))


def least_more(floor: Floor, basket: Basket) -> float:
    """Return what single readings among the undecided add to the bias at least."""
    if floor.more_bias is None:
        return 0.0
    return float(np.where(basket.allowed, floor.more_bias, inf).min(axis=1).sum())


class Search:
    """The queue of nodes, and the best study so far."""

    def __init__(self, deadline: Deadline, *, ties: bool, tell: Tell = tell_nobody) -> None:
        self.deadline = deadline
        self.tell = tell
        self.ties = ties
        self.best: tuple[Space, Settled] | None = None
        self.nodes = 0

    # ---------------------------------------------------------------------------- incumbents

    @property
    def cutoff(self) -> float:
        """The score above which, or at which, nothing is of interest."""
        if self.best is None:
            return inf
        space, settled = self.best
        score = float(settled.score)
        if space.demand.spend is not None:
            return score * (1 + FORGIVEN if self.ties else 1 - FORGIVEN)
        # What is cheaper is so by the grid of money at least.
        return score * (1 + FORGIVEN) if self.ties else score - 0.99 * space.grid

    def offer(self, space: Space, draft: Draft) -> None:
        """Take a valid draft as the best study, if it is within all limits and better."""
        worth = space.weigh(draft)
        slack = 1e-6 if space.demand.spend is None else 0.02
        if worth.wrong > 1e-6 or worth.score > self.cutoff * (1 + slack):
            return
        settled = space.settle(draft)
        if settled is not None and (self.best is None or settled.key < self.best[1].key):
            self.best = space, settled

    def round_off(self, branching: Branching, node: Node, bound: Bound) -> Draft | None:
        """Try the study that the bound was found for; return it, if it is valid at all."""
        space = branching.space
        if node.open_mediators:
            return None
        chosen = [
            (each, int(option) - 1)
            for each, option in zip(node.undecided, bound.choice, strict=True)
            if option
        ]
        covariates = node.roles.covariates | {each for each, _ in chosen}
        roles = replace(node.roles, covariates=covariates)
        draft = Draft.of(roles, dict((*node.ways, *chosen)))
        if draft not in space.known and not space.is_valid(roles):
            return None
        self.offer(space, draft)
        return draft

    # -------------------------------------------------------------------------------- bounds

    def bound(self, space: Space, floor: Floor, basket: Basket, at_least: float) -> Bound | None:
        """Return what no study below a node beats; None if that is the best so far, or a limit."""
        if space.demand.spend is not None:
            return self.narrowest(space, floor, basket, at_least)
        found = least_total(
            space, floor, basket, space.demand.reach, min(self.cutoff, space.money())
        )
        found = Bound(max(found.total, at_least), found.choice)
        if found.total > space.money() * (1 + FORGIVEN) or found.total > self.cutoff:
            return None
        if self.is_beyond_frame(space, floor, basket, space.demand.reach):
            return None
        return found

    def is_beyond_frame(
        self, space: Space, floor: Floor, basket: Basket, reach: float | None
    ) -> bool:
        """Say whether more units than there are would have to be started."""
        if space.within.frame_size is None:
            return False
        records = float(space.demand.records or 0)
        if reach is not None:
            core = space.design_effect * reach**2 * floor.variance(max(floor.least, 0.0))
            records = core + basket.measured + 1
            if floor.strongest:
                least = space.demand.least_f * space.design_effect / floor.strongest
                records = max(records, least)
        started = records / space.till.kept(basket.bought)
        return started * (1 - 2 * FORGIVEN) > space.within.frame_size

    def narrowest(
        self, space: Space, floor: Floor, basket: Basket, at_least: float
    ) -> Bound | None:
        """Return below which squared half-width (over z²) the money does not lead.

        A study of score g is one that reaches K = 1/√g within the money: the score is bounded by
        the smallest g at which the least total stays within it, found by bisection.
        """
        money = space.money()

        def serves(score: float) -> Bound | None:
            found = least_total(space, floor, basket, score**-0.5, money * (1 + 1e-6))
            is_out = found.total > money or self.is_beyond_frame(space, floor, basket, score**-0.5)
            return None if is_out else found

        high = self.cutoff if self.cutoff < inf else 1e9
        best = serves(high)
        if best is None:
            return None
        low, proved = max(at_least, min(high * 1e-6, 1e-9)), at_least
        for _ in range(16):
            middle = (low * high) ** 0.5
            found = serves(middle)
            if found is None:
                low = proved = middle
            else:
                high, best = middle, found
        return Bound(proved, best.choice)

    # --------------------------------------------------------------------------------- search

    def run(self, branchings: Sequence[Branching]) -> float:
        """Search to the end, or until the time is over.

        Returns
        -------
        float
            What no study that was not looked at beats; ∞ where none is left.
        """
        queue, told = Queue(), 0
        for branching in branchings:
            if not self.push(queue, branching, branching.roots()):
                return 0.0
        for branching, node in queue.lowest(BEGINNINGS):
            if node.rounded is not None:
                self.improve(branching.space, node.rounded)
        while queue.entries and queue.bound <= self.cutoff:
            if self.nodes - told >= TELL_AFTER:
                told = self.nodes
                self.tell(self.progress(queue.bound))
            bound, best = queue.bound, self.best
            branching, node = queue.pop()
            if not self.push(queue, branching, branching.children(node)):
                return bound
            if self.best is not None and self.best is not best:
                self.improve(self.best[0], self.best[1].draft)
        return inf

    def progress(self, bound: float) -> str:
        """Return how far the search has come, in words."""
        if self.best is None:
            return "no study within the limits yet"
        gap = max(0.0, 1 - bound / float(self.best[1].score))
        return f"{float(self.best[1].bill.total):,.2f} so far, at most {gap:.1%} from the best"

    def push(self, queue: "Queue", branching: Branching, nodes: Iterable[Node]) -> bool:
        """Put nodes into the queue, as far as they can lead to anything; look at leaves at once.

        Returns
        -------
        bool
            False if the time was over before all of them were looked at.
        """
        for each in nodes:
            if not self.deadline.left:
                return False
            node = branching.bounded(each, self)
            self.nodes += 1
            if node is None:
                continue
            if node.next is not None:
                queue.push(branching, node)
            elif branching.space.is_valid(node.roles):
                self.offer(branching.space, Draft.of(node.roles, dict(node.ways)))
        return True

    def improve(self, space: Space, draft: Draft) -> None:
        """Look for a better study downhill of a draft, in a tenth of the time that is left."""
        self.offer(space, downhill(space, draft, Deadline(self.deadline.left * IMPROVING_SHARE)))


class Queue:
    """Nodes that wait, the lowest bound first; of equal bounds the latest."""

    def __init__(self) -> None:
        self.entries: list[tuple[float, int, Branching, Node]] = []
        self._order = count(0, -1)

    @property
    def bound(self) -> float:
        """The lowest bound."""
        return self.entries[0][0]

    def push(self, branching: Branching, node: Node) -> None:
        """Put a node in."""
        heappush(self.entries, (node.bound, next(self._order), branching, node))

    def pop(self) -> tuple[Branching, Node]:
        """Take the node with the lowest bound out."""
        return heappop(self.entries)[2:]

    def lowest(self, most: int) -> list[tuple[Branching, Node]]:
        """Return some of the nodes with the lowest bounds, which stay."""
        return [entry[2:] for entry in sorted(self.entries, key=lambda each: each[:2])[:most]]

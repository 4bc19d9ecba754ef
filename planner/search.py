"""The one entry to the search: the cheapest purchase for claims, checked before it leaves.

Nothing above this module asks how an answer was found. No answer leaves it that has not passed the
plain check of its route and the limits of its bill.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction

from costs.bill import Bill, bill_for
from costs.prices import WayName
from costs.tally import Tally
from planner.claims import Claim, Roles
from planner.deadline import Deadline, Tell, tell_nobody
from planner.joint import JointStudy, cheapest_study, weighed_up
from planner.precision import Precision
from planner.program import Choice, Found, NothingFound, Within, cheapest_purchase
from planner.routes import ROUTES

__all__ = ["Answer", "cheapest"]

Opened = tuple[tuple[Claim, Roles], ...]
"""The claim that each choice opens, with its roles."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Answer:
    """The cheapest purchase for some claims, and who plays which part in each."""

    bill: Bill
    lower_bound: Fraction
    """Nothing within the limits costs less."""
    opened: Opened
    precision: Precision | None = None
    """What it achieves; None where the strengths are not known."""
    extras: Mapping[str, Fraction | None] = field(default_factory=dict)
    """Variables that validity does not need, with what the same precision would cost more without
    them; None where a limit would break without them."""
    narrowest: float | None = None
    """Where money is given: no study within the limits has a smaller half-width."""

    @property
    def proved(self) -> bool:
        """Whether nothing cheaper would do."""
        return self.lower_bound == self.bill.total


def cheapest(
    choices: Sequence[Choice], within: Within, deadline: Deadline, tell: Tell = tell_nobody
) -> Answer | NothingFound:
    """Return the cheapest purchase with which one claim of each choice comes true.

    Parameters
    ----------
    choices
        Each a list of claims, of which one has to come true; all choices share the purchases.
    within
        Prices, terms and limits.
    deadline
        A search that needs more time answers with the best purchase so far, and its bound.
    tell
        Is told how far the search has come.
    """
    if within.demand is not None:
        (choice,) = choices
        return cheapest_sized(choice, within, deadline, tell)
    return cheapest_on_records(choices, within, deadline)


def cheapest_sized(
    choice: Choice, within: Within, deadline: Deadline, tell: Tell
) -> Answer | NothingFound:
    """Return the cheapest study whose precision is known, and good enough.

    On a fixed number of records the integer program answers, if its plan keeps the limits of bias
    and first stage: nothing that keeps them costs less. Else, and at a target, set, ways and number
    of records are searched for together.
    """
    assert within.demand is not None, "precision is known"
    bound, hint = Fraction(0), None
    if within.demand.records is not None:
        plain = cheapest_on_records([choice], within, deadline)
        if isinstance(plain, NothingFound) and plain.proved:
            return plain
        bound = plain.lower_bound if isinstance(plain, Answer) else plain.bound
        if isinstance(plain, Answer):
            ((claim, roles),) = plain.opened
            weighed = weighed_up(claim, roles, dict(plain.bill.ways), within, bound)
            if weighed is not None:
                return answer_to(weighed, within)
            hint = Found(bill=plain.bill, opened=plain.opened, bound=bound, proved=plain.proved)
    study = cheapest_study(choice.claims, within, deadline, tell, hint)
    if isinstance(study, NothingFound):
        return replace(study, bound=bound)
    return answer_to(replace(study, bound=max(study.bound, bound)), within)


def answer_to(study: JointStudy, within: Within) -> Answer:
    """Return a study as an answer, once it has passed the plain checks."""
    claim = study.claim
    assert ROUTES[claim.route].is_valid(claim, study.roles), "the plain check agrees"
    assert not within.broken(study.bill), "the bill keeps the limits"
    return Answer(
        bill=study.bill,
        lower_bound=study.bound,
        opened=((claim, study.roles),),
        precision=study.precision,
        extras={claim.diagram.names[each.node]: each.saves for each in study.extras},
        narrowest=study.narrowest,
    )


def cheapest_on_records(
    choices: Sequence[Choice], within: Within, deadline: Deadline
) -> Answer | NothingFound:
    """Return the cheapest purchase for the number of records in the terms."""
    found = cheapest_purchase(
        choices,
        within,
        lambda program, claim, measurable, opens: ROUTES[claim.route].rows.write_rows(
            program, claim, measurable, opens
        ),
        deadline.left,
    )
    if isinstance(found, NothingFound):
        return found if found.proved else plain_answer(choices, within, found.bound) or found
    opened = tuple((claim, in_order(claim, minimal(claim, roles))) for claim, roles in found.opened)
    return checked(opened, dict(found.bill.ways), within, found)


def checked(opened: Opened, ways: dict[str, str], within: Within, found: Found) -> Answer:
    """Return what was found as an answer, once it has passed every check."""
    answer = answer_of(opened, ways, within, found.bound)
    for claim, roles in opened:
        assert ROUTES[claim.route].is_valid(claim, roles), "the plain check agrees with the program"
    assert not within.broken(answer.bill), "the bill keeps the limits that the program was given"
    assert answer.bill.total <= found.bill.total, "what is dropped saves money"
    return answer


def answer_of(opened: Opened, ways: dict[str, str], within: Within, bound: Fraction) -> Answer:
    """Return the answer in which everyone who plays a part is measured in these ways."""
    bill = bill_for(wanted_ways(opened, ways), within.prices, within.terms)
    return Answer(bill=bill, lower_bound=min(bound, bill.total), opened=opened)


def wanted_ways(opened: Opened, ways: dict[str, str]) -> list[WayName]:
    """Return the ways of those who play a part: treatments and outcomes, then others by name."""
    ends: list[str] = []
    others: set[str] = set()
    for claim, roles in opened:
        ends += claim.diagram.named((claim.treatment, claim.outcome))
        others |= set(claim.diagram.named(roles.nodes))
    order = dict.fromkeys([*ends, *sorted(others)])
    return [(variable, ways[variable]) for variable in order]


def minimal(claim: Claim, roles: Roles) -> Roles:
    """Return the roles without anyone who can be spared alone.

    A proved answer has nobody who can be spared, since fewer variables win a tie; one that the time
    cut short may. Dropping one can make another dispensable, so it goes on until nobody is.
    """
    is_valid = ROUTES[claim.route].is_valid
    while True:
        for node in reversed(claim.diagram.by_name(roles.nodes)):
            if is_valid(claim, roles.without(node)):
                roles = roles.without(node)
                break
        else:
            return roles


def in_order(claim: Claim, roles: Roles) -> Roles:
    """Return the roles with the instrument of the smallest name, where several would do.

    Which of two variables is called the instrument must not hang on the solver.
    """
    if not roles.instruments:
        return roles
    for node in claim.diagram.by_name(roles.nodes):
        turned = Roles(instruments=frozenset((node,)), covariates=roles.nodes - {node})
        if ROUTES[claim.route].is_valid(claim, turned):
            # Seen this way round, someone may be dispensable.
            return minimal(claim, turned)
    return roles


def plain_answer(choices: Iterable[Choice], within: Within, bound: Fraction) -> Answer | None:
    """Return a valid plan that takes no search, if it stays within the limits.

    For each choice the first claim that is open, with roles that open it and nobody who can be
    spared, each measured in the way that is cheapest by itself.
    """
    cheap = cheapest_ways(within)
    opened = []
    for choice in choices:
        found = next((each for claim in choice.claims if (each := opening(claim, cheap))), None)
        if found is None:
            return None
        opened.append(found)
    answer = answer_of(tuple(opened), cheap, within, bound)
    return None if within.broken(answer.bill) else answer


def cheapest_ways(within: Within) -> dict[str, str]:
    """Return, for each variable, the way that is cheapest by itself."""
    tally = Tally.of(within.prices, within.terms)
    cheap = {}
    for variable, ways in within.prices.ways.items():
        lines = {way: tally.line((variable, way), tally.first_level) for way in ways}
        cheap[variable] = min(sorted(lines), key=lines.__getitem__)
    return cheap


def opening(claim: Claim, measurable: Iterable[str]) -> tuple[Claim, Roles] | None:
    """Return a claim with roles that open its route, if what is measurable can open it."""
    names = [name for name in measurable if name in claim.diagram.numbers]
    nodes = claim.diagram.nodes(names)
    if not claim.ends <= nodes:
        return None
    roles = ROUTES[claim.route].criterion.opening(claim, nodes)
    if roles is None:
        return None
    return claim, in_order(claim, minimal(claim, roles))

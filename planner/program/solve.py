"""The cheapest purchases that make claims true: the whole program, solved to a proof.

    minimise    spent                                                                          (9)
    then        Σ_v measured_v                                                                (10)
    then        the sorted list of names, the number of the claim, the ways                   (11)
    subject to  the purchases (1)–(8)
                Σ over claims c of a choice of opens_c = 1             for each choice        (12)
                measured_v = 1                                         for treatment, outcome (13)
                the rows of each claim, which bind where it is opened

Every wish after the first is solved for with the earlier ones held at their best, so that the same
input gives the same answer on any machine.
"""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from math import floor
from time import monotonic
from typing import TYPE_CHECKING

from costs.bill import Bill, bill_for
from costs.prices import WayName
from costs.tally import Overflow
from planner.claims import Claim, Roles
from planner.diagram import Nodes
from planner.program.model import Literal, Program, RoleLiterals, Term, negation, weighted
from planner.program.purchases import Shop, write_purchases, write_spending
from planner.program.within import Within

if TYPE_CHECKING:
    from ortools.sat.python import cp_model

__all__ = ["Choice", "Found", "NothingFound", "Solved", "WriteRows", "cheapest_purchase"]

MOST_DIGITS = 60
"""Bits of one wish among (11); the sorted list of names is looked at up to so many variables."""

WriteRows = Callable[[Program, Claim, Nodes, Literal], RoleLiterals]
"""Writes the rows of a claim, given what is measurable and whether the claim is opened."""


@dataclass(frozen=True, slots=True)
class Choice:
    """Claims of which exactly one has to come true, in order of preference."""

    claims: tuple[Claim, ...]


@dataclass(frozen=True, kw_only=True, slots=True)
class Found:
    """What the solver would buy."""

    bill: Bill
    opened: tuple[tuple[Claim, Roles], ...]
    """The claim that each choice opens, and who plays which part in it."""
    bound: Fraction
    """No purchase within the limits comes to less, surcharges included."""
    proved: bool
    """Whether nothing cheaper exists."""


@dataclass(frozen=True, slots=True)
class NothingFound:
    """No purchase was found; with ``proved`` there is none."""

    proved: bool
    bound: Fraction = Fraction(0)
    """If there is one, it comes to no less."""


Solved = Found | NothingFound


def cheapest_purchase(
    choices: Sequence[Choice], within: Within, write_rows: WriteRows, seconds: float
) -> Solved:
    """Return the cheapest purchase with which one claim of each choice comes true.

    The program knows the levels of loss that were met before, so that it is never above the exact
    bill. While its answers turn out dearer than it took them to be, it learns their level and is
    solved again; the best purchase so far, and the highest bound, are kept.

    Raises
    ------
    Overflow
        If plans cannot be added up in whole numbers.
    """
    shop = Shop.of(within)
    if shop.is_too_small:
        return NothingFound(proved=True)
    deadline = monotonic() + seconds
    best: Found | None = None
    bound = Fraction(0)
    hint: Sequence[int] = ()
    while True:
        search = Search(choices, shop, write_rows, deadline, best, hint)
        draft = search.draft()
        bound = max(bound, draft.bound)
        if draft.found is None:
            return settled(draft, best, bound, shop)
        found, hint = draft.found, draft.answer
        if draft.proved:
            assert draft.counted <= found.bill.total, "a best answer is best"
        is_kept = not within.broken(found.bill) and shop.tally.is_countable(found.bill.started)
        if draft.proved and is_kept and found.bill.total == draft.counted:
            return replace(found, bound=draft.counted, proved=True)
        if is_kept and (best is None or found.bill.total < best.bill.total):
            best = found
        if monotonic() >= deadline:
            return settled(draft, best, bound, shop)
        shop = shop.with_level(found.bill)


def settled(draft: "Draft", best: Found | None, bound: Fraction, shop: Shop) -> Solved:
    """Return what can be said when the last run gave nothing, or the time is over."""
    if best is not None:
        # A program without an answer says that nothing undercuts the best so far.
        proved = draft.found is None and draft.proved
        bound = best.bill.total if proved else min(bound, best.bill.total)
        return replace(best, bound=bound, proved=bound == best.bill.total)
    if draft.found is None and draft.proved and shop.is_cut:
        raise Overflow("leads to more units, or to a larger sum, than can be counted.")
    return NothingFound(proved=draft.found is None and draft.proved, bound=bound)


@dataclass(frozen=True, kw_only=True, slots=True)
class Draft:
    """The answer of one program, before its bill is compared with what the program knew."""

    found: Found | None
    answer: Sequence[int]
    """The value of each variable; empty where no answer was found."""
    counted: Fraction
    """What the program took it to cost."""
    bound: Fraction
    proved: bool
    """The answer is a best one of this program, or there is none."""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What one run of the solver gave."""

    answer: Sequence[int]
    bound: int
    proved: bool


class Search:
    """One program, and the wishes that are solved for one after the other."""

    def __init__(
        self,
        choices: Sequence[Choice],
        shop: Shop,
        write_rows: WriteRows,
        deadline: float,
        best: Found | None = None,
        hint: Sequence[int] = (),
    ) -> None:
        self._choices = choices
        self._shop = shop
        self._deadline = deadline
        self._program = Program()
        self._buy = write_purchases(self._program, shop)
        self._written = [
            write_choice(self._program, number, choice, shop.within, write_rows)
            for number, choice in enumerate(choices)
        ]
        # Levels come last, so that the answer of a program with fewer of them is a hint.
        self._spent = write_spending(self._program, shop, self._buy)
        self._money = shop.tally.unit * shop.within.terms.surcharge
        if best is not None:
            most = best.bill.total / self._money
            self._program.at_most("no dearer than the best so far", self._spent, int(most))
        self._answer: Sequence[int] = hint
        """The value of each variable in the best answer so far, or a guess at it."""
        self._wish: Sequence[Term] = self._spent

    def draft(self) -> Draft:
        """Return the cheapest purchase that the program knows, ties resolved."""
        outcome = self._minimise()
        if not outcome.answer:
            bound = Fraction(0)
            return Draft(found=None, answer=(), counted=bound, bound=bound, proved=outcome.proved)
        counted = self._value(self._spent)
        if outcome.proved:
            # One wish after the other, until one of them runs out of time.
            all(
                self._prefer(wish)
                for wishes in (self._fewer, self._smaller_names, self._earlier, self._better_ways)
                for wish in wishes()
            )
        bound = (counted if outcome.proved else outcome.bound) * self._money
        terms, prices = self._shop.within.terms, self._shop.within.prices
        found = Found(
            bill=bill_for(self._ways(), prices, terms),
            opened=tuple(self._opened()),
            bound=bound,
            proved=False,
        )
        return Draft(
            found=found,
            answer=self._answer,
            counted=counted * self._money,
            bound=bound,
            proved=outcome.proved,
        )

    def _minimise(self) -> Outcome:
        model = self._program.model
        model.minimize(weighted(self._wish))
        model.clear_hints()  # type: ignore[no-untyped-call]  # the one method without types
        for index, value in enumerate(self._answer):
            model.add_hint(model.get_bool_var_from_proto_index(index), value)
        outcome = solved_model(model, self._deadline - monotonic())
        self._answer = outcome.answer or self._answer
        return outcome

    def _prefer(self, wish: Sequence[Term]) -> bool:
        """Hold the last wish at its best, and solve for the next one."""
        self._program.at_most("held", self._wish, self._value(self._wish))
        self._wish = wish
        return self._minimise().proved

    def _fewer(self) -> Iterator[Sequence[Term]]:
        """(10)."""
        yield [(1, literal) for literal in self._program.measured.values()]

    def _smaller_names(self) -> Iterator[Sequence[Term]]:
        """(11): of two lists of one length the smaller has the smaller name where they differ."""
        measured = self._program.measured
        if len(measured) <= MOST_DIGITS:
            names = sorted(measured, reverse=True)
            yield [(-(2**digit), measured[name]) for digit, name in enumerate(names)]

    def _earlier(self) -> Iterator[Sequence[Term]]:
        """(11): the first of the claims that tie."""
        yield from digits(
            [{rank: opens for rank, (opens, _) in enumerate(each)} for each in self._written]
        )

    def _better_ways(self) -> Iterator[Sequence[Term]]:
        """(11): who is measured is settled by now; of ways that tie, the better reading."""
        measured = self._program.measured
        for literal in measured.values():
            self._program.equal("held", [(1, literal)], [(self._of(literal), True)])
        yield from digits(
            [self._ranked(name) for name in sorted(measured) if self._of(measured[name])]
        )

    def _ranked(self, variable: str) -> dict[int, Literal]:
        """Return the ways of a variable by rank: better readings first, then smaller names."""
        ways = self._shop.within.prices.ways[variable]
        order = sorted(ways, key=lambda way: (-ways[way].reliability, way))
        return {rank: self._buy[variable, way] for rank, way in enumerate(order)}

    def _of(self, literal: Literal) -> int:
        return int(literal) if isinstance(literal, bool) else self._answer[literal.index]

    def _value(self, terms: Sequence[Term]) -> int:
        return sum(coefficient * self._of(literal) for coefficient, literal in terms)

    def _ways(self) -> list[WayName]:
        return [
            name
            for name, literal in self._buy.items()
            if isinstance(name, tuple) and self._of(literal)
        ]

    def _opened(self) -> Iterator[tuple[Claim, Roles]]:
        for choice, written in zip(self._choices, self._written, strict=True):
            for claim, (opens, roles) in zip(choice.claims, written, strict=True):
                if self._of(opens):
                    yield claim, Roles(**{role: self._chosen(roles[role]) for role in roles})

    def _chosen(self, literals: Mapping[int, Literal]) -> Nodes:
        return frozenset(node for node, literal in literals.items() if self._of(literal))


def digits(columns: Sequence[Mapping[int, Literal]]) -> Iterator[list[Term]]:
    """Return the wish for the smallest number of which each column is a digit.

    A number of more than ``MOST_DIGITS`` bits is wished for in several parts, the first ones first.
    """
    parts: list[tuple[int, list[Term]]] = [(1, [])]
    for column in reversed([column for column in columns if len(column) > 1]):
        weight, terms = parts[-1]
        if weight * len(column) >= 2**MOST_DIGITS:
            weight, terms = 1, []
            parts.append((weight, terms))
        terms.extend((weight * digit, literal) for digit, literal in column.items())
        parts[-1] = (weight * len(column), terms)
    yield from (terms for _, terms in reversed(parts) if terms)


def write_choice(
    program: Program, number: int, choice: Choice, within: Within, write_rows: WriteRows
) -> list[tuple[Literal, RoleLiterals]]:
    """Write (12), (13) and the rows of each claim.

    Returns
    -------
    list
        For each claim, whether it is opened, and the literals of its roles.
    """
    only = len(choice.claims) == 1
    written: list[tuple[Literal, RoleLiterals]] = []
    for claim in choice.claims:
        opens = True if only else program.literal(f"opens[{number}: {claim.route}]")
        for end in claim.diagram.named(sorted(claim.ends)):
            measured = program.measured.get(end, False)
            program.clause(f"measured[{end}]", negation(opens), measured)
        names = [name for name in within.prices.ways if name in claim.diagram.numbers]
        roles = write_rows(program, claim, claim.diagram.nodes(names), opens)
        written.append((opens, roles))
    if not only:
        program.exactly_one(f"one claim[{number}]", (opens for opens, _ in written))
    return written


def solved_model(model: "cp_model.CpModel", seconds: float) -> Outcome:
    """Run the solver so that a run repeats: one worker, a set seed, its own clock too."""
    from ortools.sat.python import cp_model  # noqa: PLC0415

    solver = cp_model.CpSolver()
    # The presolve of ortools 9.15 lost the best answer of a small study (tests/planner/
    # test_program.py tells which); these programs are solved as fast without it.
    solver.parameters.cp_model_presolve = False
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = 1
    solver.parameters.max_time_in_seconds = max(seconds, 0.01)
    solver.parameters.max_deterministic_time = max(seconds, 0.01)
    status = solver.solve(model)
    assert status != cp_model.MODEL_INVALID, model.validate()
    if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
        return Outcome((), 0, proved=status == cp_model.INFEASIBLE)
    # The bound comes as a float; a relative 1e-9 is more than its rounding.
    bound = floor(solver.best_objective_bound * (1 - 1e-9))
    answer = tuple(solver.response_proto.solution)
    return Outcome(answer, max(bound, 0), proved=status == cp_model.OPTIMAL)

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
from planner.claims import Claim, Roles
from planner.diagram import Nodes
from planner.program.model import Literal, Program, RoleLiterals, Term, negation, weighted
from planner.program.purchases import Shop, write_purchases
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
    counted: Fraction
    """What the program took it to cost; the bill may come to more."""
    bound: Fraction
    """No purchase within the limits comes to less, surcharges included."""
    proved: bool
    """Whether nothing cheaper exists."""


@dataclass(frozen=True, slots=True)
class NothingFound:
    """No purchase was found; with ``proved`` there is none."""

    proved: bool


Solved = Found | NothingFound


def cheapest_purchase(
    choices: Sequence[Choice], within: Within, write_rows: WriteRows, seconds: float
) -> Solved:
    """Return the cheapest purchase with which one claim of each choice comes true.

    Raises
    ------
    Overflow
        If the amounts cannot be counted in whole numbers.
    """
    shop = Shop.of(within)
    if shop.is_too_small:
        return NothingFound(proved=True)
    deadline = monotonic() + seconds
    while True:
        search = Search(choices, shop, write_rows, deadline)
        solved = search.solved()
        if isinstance(solved, NothingFound):
            return solved
        # (1) knows the levels met so far only, so that it is never above the exact bill.
        assert not solved.proved or solved.counted <= solved.bill.total, "a best answer is best"
        broken = within.broken(solved.bill)
        if solved.bill.total == solved.counted and not broken:
            return solved
        if monotonic() >= deadline:
            return NothingFound(proved=False) if broken else replace(solved, proved=False)
        shop = shop.with_level(solved.bill)


@dataclass(frozen=True, slots=True)
class Outcome:
    """What one run of the solver gave."""

    answer: Sequence[int]
    """The value of each variable; empty where no answer was found."""
    bound: int
    proved: bool
    """The answer is a best one, or there is none."""


class Search:
    """One program, and the wishes that are solved for one after the other."""

    def __init__(
        self, choices: Sequence[Choice], shop: Shop, write_rows: WriteRows, deadline: float
    ) -> None:
        self._choices = choices
        self._shop = shop
        self._deadline = deadline
        self._program = Program()
        self._spending = write_purchases(self._program, shop)
        self._written = [
            write_choice(self._program, number, choice, shop.within, write_rows)
            for number, choice in enumerate(choices)
        ]
        self._answer: Sequence[int] = ()
        """The value of each variable in the best answer so far."""

    def solved(self) -> Solved:
        """Return the cheapest purchase that the program knows, ties resolved."""
        wish: Sequence[Term] = self._spending.spent
        outcome = self._minimise(wish)
        if not self._answer:
            return NothingFound(proved=outcome.proved)
        counted = self._value(wish)
        if outcome.proved:
            for following in self._ties():
                self._hold(wish)
                wish = following
                if not self._minimise(wish).proved:
                    break
        money = self._shop.tally.unit * self._shop.within.terms.surcharge
        return Found(
            bill=bill_for(self._ways(), self._shop.within.prices, self._shop.within.terms),
            opened=tuple(self._opened()),
            bound=(counted if outcome.proved else outcome.bound) * money,
            counted=counted * money,
            proved=outcome.proved,
        )

    def _minimise(self, wish: Sequence[Term]) -> Outcome:
        model = self._program.model
        model.minimize(weighted(wish))
        model.clear_hints()  # type: ignore[no-untyped-call]  # the one method without types
        for index, value in enumerate(self._answer):
            model.add_hint(model.get_bool_var_from_proto_index(index), value)
        outcome = solved_model(model, self._deadline - monotonic())
        self._answer = outcome.answer or self._answer
        return outcome

    def _hold(self, wish: Sequence[Term]) -> None:
        self._program.at_most("held", wish, self._value(wish))

    def _ties(self) -> Iterator[list[Term]]:
        """(10) and (11); what is yielded is solved for before the next one is asked for."""
        measured = self._program.measured
        yield [(1, literal) for literal in measured.values()]
        if len(measured) <= MOST_DIGITS:
            # Of two lists of one length the smaller has the smaller name where they first differ.
            names = sorted(measured, reverse=True)
            yield [(-(2**digit), measured[name]) for digit, name in enumerate(names)]
        yield from self._digits(
            [{rank: opens for rank, (opens, _) in enumerate(written)} for written in self._written]
        )
        for literal in measured.values():
            self._program.equal("held", [(1, literal)], [(self._of(literal), True)])
        yield from self._digits(
            [self._ranked(name) for name in sorted(measured) if self._of(measured[name])]
        )

    def _ranked(self, variable: str) -> dict[int, Literal]:
        """Return the ways of a variable by rank: better readings first, then smaller names."""
        ways = self._shop.within.prices.ways[variable]
        order = sorted(ways, key=lambda way: (-ways[way].reliability, way))
        return {rank: self._spending.buy[variable, way] for rank, way in enumerate(order)}

    def _digits(self, columns: Sequence[Mapping[int, Literal]]) -> Iterator[list[Term]]:
        """Return the wish for the smallest number of which each column is a digit.

        A number of more than ``MOST_DIGITS`` bits is wished for in several parts.
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

    def _of(self, literal: Literal) -> int:
        return int(literal) if isinstance(literal, bool) else self._answer[literal.index]

    def _value(self, terms: Sequence[Term]) -> int:
        return sum(coefficient * self._of(literal) for coefficient, literal in terms)

    def _ways(self) -> list[WayName]:
        """Return the ways that are taken, treatment and outcome first, the others by name."""
        taken = [
            name
            for name, literal in self._spending.buy.items()
            if isinstance(name, tuple) and self._of(literal)
        ]
        return sorted(taken)

    def _opened(self) -> Iterator[tuple[Claim, Roles]]:
        for choice, written in zip(self._choices, self._written, strict=True):
            for claim, (opens, roles) in zip(choice.claims, written, strict=True):
                if self._of(opens):
                    yield claim, Roles(**{role: self._chosen(roles[role]) for role in roles})

    def _chosen(self, literals: Mapping[int, Literal]) -> Nodes:
        return frozenset(node for node, literal in literals.items() if self._of(literal))


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

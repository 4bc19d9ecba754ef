"""A CP-SAT model in the making: literals, clauses and sums, each row with a name.

A literal that is known beforehand is a plain ``bool``, and a row that it settles is not written:
what cannot be chosen gets no variable.
"""

from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from ortools.sat.python import cp_model
    from ortools.sat.python.cp_model_helper import Literal as Boolean

__all__ = ["Literal", "Program", "RoleLiterals", "Term", "negation"]

Literal: TypeAlias = "Boolean | bool"
Term: TypeAlias = tuple[int, Literal]
"""A whole number times a literal."""
RoleLiterals: TypeAlias = Mapping[str, Mapping[int, Literal]]
"""Whether each node plays a role, by the field of ``Roles``."""


def negation(literal: Literal) -> Literal:
    """Return the opposite of a literal."""
    return not literal if isinstance(literal, bool) else literal.negated()


class Program:
    """The model that rows are written into."""

    def __init__(self) -> None:
        # Imported here: it takes half a second, and a study is read and checked without it.
        from ortools.sat.python import cp_model  # noqa: PLC0415

        self.model: cp_model.CpModel = cp_model.CpModel()
        self.measured: dict[str, Literal] = {}
        """Whether each variable is measured; what cannot be measured is left out."""

    def literal(self, name: str) -> Literal:
        """Return a new yes-or-no variable."""
        return self.model.new_bool_var(name)

    def clause(self, name: str, *literals: Literal) -> None:
        """At least one of the literals is true."""
        if not any(literal is True for literal in literals):
            open_ones = [literal for literal in literals if literal is not False]
            self.model.add_bool_or(open_ones).with_name(name)

    def exactly_one(self, name: str, literals: Iterable[Literal]) -> None:
        """Exactly one of the literals is true."""
        self.model.add_exactly_one(list(literals)).with_name(name)

    def at_most(self, name: str, terms: Iterable[Term], most: int, unless: Literal = False) -> None:
        """Σ coefficient · literal ≤ most, unless a literal is true.

        A row that cannot be broken is not written: ``most`` may be more than the solver counts.
        """
        terms = list(terms)
        largest = sum(coefficient for coefficient, literal in terms if literal is not False)
        if unless is not True and largest > most:
            row = self.model.add(weighted(terms) <= most).with_name(name)
            if not isinstance(unless, bool):
                row.only_enforce_if(unless.negated())

    def equal(self, name: str, left: Iterable[Term], right: Iterable[Term]) -> None:
        """Σ left = Σ right."""
        self.model.add(weighted(left) == weighted(right)).with_name(name)

    def roles(
        self, name: str, people: Iterable[tuple[int, str]], opens: Literal
    ) -> dict[int, Literal]:
        """Return a literal for each node that may play a role.

            role_v ≤ measured_v,   role_v ≤ opens

        Parameters
        ----------
        people
            Nodes and the names of their variables.
        opens
            Whether the claim is made at all.
        """
        literals = {}
        for node, variable in people:
            literals[node] = role = self.literal(f"{name}[{variable}]")
            self.clause(f"{name} is measured[{variable}]", negation(role), self.measured[variable])
            self.clause(f"{name} is wanted[{variable}]", negation(role), opens)
        return literals


def weighted(terms: Iterable[Term]) -> "cp_model.LinearExprT":
    """Return Σ coefficient · literal."""
    from ortools.sat.python import cp_model  # noqa: PLC0415

    constant, literals, coefficients = 0, [], []
    for coefficient, literal in terms:
        if isinstance(literal, bool):
            constant += coefficient * literal
        else:
            literals.append(literal)
            coefficients.append(coefficient)
    return cp_model.LinearExpr.weighted_sum(literals, coefficients) + constant

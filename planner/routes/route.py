"""What a route has to offer; each folder beside this file offers it once."""

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass

from planner.claims import Claim, Finding, Roles
from planner.diagram import Nodes
from planner.program import Literal, Program, RoleLiterals

__all__ = ["Route", "Words"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Words:
    """How a route is spoken of.

    Sentences take ``{path}``, ``{who}`` (the first node), ``{others}`` (the rest), ``{treatment}``
    and ``{outcome}``.
    """

    title: str
    """The route's name in a sentence, after "by"."""
    analysis: str
    """What is done with the readings; takes ``{instruments}``, ``{mediators}``, and ``{covariates}``."""
    bare_analysis: str
    """The same where there are no covariates."""
    estimand: str
    leans_on: tuple[str, ...]
    """What must be true and cannot be seen in the data; each a clause in plain words."""
    sentences: Mapping[str, str]
    """A sentence for each kind of finding that is this route's own, or that it words its own way."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Route:
    """A way to learn an effect, as functions of a claim."""

    name: str
    candidates: Callable[[Claim, Nodes], Roles]
    """Who may play which role in a cheapest plan, among the measurable nodes."""
    breaches: Callable[[Claim, Roles], Iterator[Finding]]
    """The conditions that roles fail; none if they are valid. Knows no solver."""
    write_rows: Callable[[Program, Claim, Nodes, Literal], RoleLiterals]
    """The same conditions as rows of the integer program."""
    opened: Callable[[Claim, Roles], Finding]
    """What opens the route."""
    needed: Callable[[Claim, Roles, int], Finding]
    """What would go wrong without one of the roles."""
    left_out: Callable[[Claim, Roles, int], Finding]
    """Why another measurable node is not wanted."""
    hindrances: Callable[[Claim, Nodes], tuple[Finding, ...]]
    """Why the route cannot be taken, whatever is bought."""
    words: Words

    def is_valid(self, claim: Claim, roles: Roles) -> bool:
        """Say whether the roles open the route: the plain check that every answer has to pass."""
        return next(self.breaches(claim, roles), None) is None

"""What a route has to offer: a folder whose modules hold the functions named here."""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from importlib import import_module
from types import ModuleType
from typing import TYPE_CHECKING, Protocol, cast

from planner.claims import Claim, Roles, Separation
from planner.diagram import Nodes
from planner.findings import Finding
from planner.program import Literal, Program, RoleLiterals

if TYPE_CHECKING:
    from planner.bounds import Floor, Sight
    from planner.precision import Estimator

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
    """What is done; takes ``{instruments}``, ``{mediators}`` and ``{covariates}`` too."""
    bare_analysis: str
    """The same where there are no covariates."""
    estimand: str
    leans_on: tuple[str, ...]
    """What must be true and cannot be seen in the data; each a clause in plain words. They take
    ``{instruments}``, ``{mediators}`` and, once it is known, ``{first_stage}``."""
    sentences: Mapping[str, str]
    """A sentence for each kind of finding that this route words its own way."""


class Criterion(Protocol):
    """What ``criterion.py`` offers: the conditions of the route, checked without a solver."""

    def candidates(self, claim: Claim, measurable: Nodes) -> Roles:
        """Return who may play which role in a cheapest plan, among the measurable nodes."""

    def separations(self, claim: Claim, roles: Roles) -> tuple[Separation, ...]:
        """Return what the covariates have to close."""

    def breaches(self, claim: Claim, roles: Roles) -> Iterator[Finding]:
        """Return each condition that the roles fail; none if they are valid."""

    def opening(self, claim: Claim, measurable: Nodes) -> Roles | None:
        """Return roles that open the route, whatever they cost; None just if there are none."""


class Rows(Protocol):
    """What ``rows.py`` offers: the same conditions as rows of the integer program."""

    def write_rows(
        self, program: Program, claim: Claim, measurable: Nodes, opens: Literal
    ) -> RoleLiterals:
        """Write the rows, which bind where the claim is opened; return the roles."""


class Reasons(Protocol):
    """What ``reasons.py`` offers: why each variable is in a plan or not, and why there is none."""

    def opened(self, claim: Claim, roles: Roles) -> Finding:
        """Say what opens the route."""

    def needed(self, claim: Claim, roles: Roles, node: int) -> Finding:
        """Say what would go wrong without one of the roles."""

    def left_out(self, claim: Claim, roles: Roles, nodes: Iterable[int]) -> dict[int, Finding]:
        """Say why each of some other measurable nodes is not wanted."""

    def hindrances(self, claim: Claim, measurable: Nodes) -> tuple[Finding, ...]:
        """Say why the route cannot be taken, whatever is bought; for routes with no opening."""


class Bounds(Protocol):
    """What ``bounds.py`` offers: what no plan below a node of the search can beat."""

    def floor(self, sight: "Sight") -> "Floor":
        """Return bounds on precision and bias for all that is still undecided."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Route:
    """A way to learn an effect: the modules of its folder, under one name."""

    name: str
    criterion: Criterion
    rows: Rows
    reasons: Reasons
    words: Words

    @property
    def precision(self) -> "Estimator":
        """The route's ``precision.py``, with V and β."""
        return cast("Estimator", self._module("precision"))

    @property
    def bounds(self) -> "Bounds":
        """The route's ``bounds.py``, with what the search must not overlook."""
        return cast(Bounds, self._module("bounds"))

    def _module(self, name: str) -> ModuleType:
        # Loaded when it is asked for: both need numpy, and ``check`` does without.
        return import_module(f"planner.routes.{self.name}.{name}")

    def is_valid(self, claim: Claim, roles: Roles) -> bool:
        """Say whether the roles open the route: the plain check that every answer has to pass."""
        return next(self.criterion.breaches(claim, roles), None) is None

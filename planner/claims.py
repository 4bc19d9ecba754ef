"""What a plan may claim: that one route, in one diagram, leads to one effect."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace

from planner.diagram import Diagram, Nodes, Path

__all__ = ["Claim", "Roles", "Separation"]

NONE: Nodes = frozenset()


@dataclass(frozen=True, kw_only=True, slots=True)
class Claim:
    """One effect, in one diagram, by one route; with what every route asks of the diagram."""

    route: str
    diagram: Diagram
    treatment: int
    outcome: int
    selected: Nodes
    """S: one value in every row, so it stands in every conditioning set, and costs nothing."""
    after: Nodes
    """De(X): the treatment and everything after it."""
    causal: Nodes
    """cn: the nodes of directed paths from treatment to outcome, the treatment left out."""
    forbidden: Nodes
    """forb = De(cn) ∪ {X, Y}."""
    noncausal: Diagram
    """G_nc: the diagram without the first arrow of every directed path."""

    @classmethod
    def of(
        cls,
        route: str,
        diagram: Diagram,
        treatment: str,
        outcome: str,
        selected: Iterable[str] = (),
    ) -> "Claim":
        """Return the claim that ``route`` leads to the effect of ``treatment`` on ``outcome``."""
        x, y = diagram.numbers[treatment], diagram.numbers[outcome]
        causal = diagram.causal_nodes(x, y)
        return cls(
            route=route,
            diagram=diagram,
            treatment=x,
            outcome=y,
            selected=diagram.nodes(selected),
            after=diagram.descendants([x]),
            causal=causal,
            forbidden=diagram.descendants(causal) | {x, y},
            noncausal=diagram.without_causal_arrows(x, y),
        )

    @property
    def is_about_nothing(self) -> bool:
        """Whether the effect is zero by the diagram: no directed path leads to the outcome."""
        return self.outcome not in self.after

    @property
    def ends(self) -> Nodes:
        """The treatment and the outcome."""
        return frozenset((self.treatment, self.outcome))

    def before(self, measurable: Nodes) -> Nodes:
        """Return what can be measured, does not follow from the treatment and is not in S."""
        return measurable - self.after - self.selected


@dataclass(frozen=True, kw_only=True, slots=True)
class Roles:
    """Who plays which part in the planned analysis, besides treatment and outcome."""

    covariates: Nodes = NONE
    instruments: Nodes = NONE
    mediators: Nodes = NONE

    @property
    def nodes(self) -> Nodes:
        """All that must be measured for it, besides treatment and outcome."""
        return self.covariates | self.instruments | self.mediators

    def without(self, node: int) -> "Roles":
        """Return the same roles without one node."""
        gone = {node}
        return Roles(
            covariates=self.covariates - gone,
            instruments=self.instruments - gone,
            mediators=self.mediators - gone,
        )

    def adjusting(self, node: int) -> "Roles":
        """Return the same roles with one more covariate."""
        return replace(self, covariates=self.covariates | {node})


@dataclass(frozen=True, kw_only=True, slots=True)
class Separation:
    """That all paths between two groups are closed: what a route asks of its covariates."""

    diagram: Diagram
    """The diagram with the arrows taken out that do not count here."""
    starts: Nodes
    ends: Nodes
    given: Nodes

    def breach(self) -> Path | None:
        """Return a path that is open, if the separation does not hold."""
        return self.diagram.open_path(self.starts, self.ends, self.given)

    def breach_with(self, node: int) -> Path | None:
        """Return a path that conditioning on one node more would open."""
        return self.diagram.open_path(self.starts, self.ends, self.given | {node})

    def sides(self) -> Iterator[Nodes]:
        """Return the two groups, the ends first."""
        yield self.ends
        yield self.starts

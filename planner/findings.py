"""What is found out about a diagram: by node inside, by name in an answer."""

from dataclasses import dataclass
from itertools import pairwise

from planner.diagram import Diagram, Path

__all__ = ["Finding", "Reason", "Trail", "reason_of", "trail_of"]


@dataclass(frozen=True, slots=True)
class Finding:
    """Something found out about a diagram: its kind, a path that shows it, who takes part."""

    kind: str
    path: Path = ()
    nodes: tuple[int, ...] = ()
    """For a finding about one node, that one first."""


@dataclass(frozen=True, slots=True)
class Trail:
    """A path by the names of its variables."""

    names: tuple[str, ...] = ()
    forward: tuple[bool, ...] = ()
    """For each step, whether the arrow points from the first to the second."""


@dataclass(frozen=True, slots=True)
class Reason:
    """Why something is so: a kind from the list in DEVELOPERS.md, and what shows it."""

    kind: str
    trail: Trail = Trail()
    variables: tuple[str, ...] = ()
    """Who takes part; for a reason about one variable, that one first."""


def trail_of(diagram: Diagram, path: Path) -> Trail:
    """Return a path by name, with the way its arrows point."""
    steps = pairwise(path)
    forward = tuple(tail in diagram.parents[head] for tail, head in steps)
    return Trail(diagram.named(path), forward)


def reason_of(diagram: Diagram, finding: Finding) -> Reason:
    """Return a finding by name."""
    return Reason(finding.kind, trail_of(diagram, finding.path), diagram.named(finding.nodes))

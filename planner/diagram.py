"""The causal diagram: a directed graph without circles, with names outside and integers inside.

Unmeasurable variables are ordinary nodes that are never conditioned on, so that nothing has to be
projected away: every test is made in the full diagram.

A path is a tuple of nodes; the way its arrows point is looked up in the diagram.
"""

from collections import deque
from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import TypeVar

__all__ = ["Diagram", "Nodes", "Path"]

Nodes = frozenset[int]
Path = tuple[int, ...]

State = TypeVar("State", int, tuple[int, int])

UP, DOWN = 0, 1
"""How a walk comes to a node: up from one of its children, or down from one of its parents."""


@dataclass(frozen=True, slots=True)
class Diagram:
    """A directed acyclic graph."""

    names: tuple[str, ...]
    parents: tuple[tuple[int, ...], ...]
    children: tuple[tuple[int, ...], ...]
    numbers: Mapping[str, int]
    """The node of each name."""

    @classmethod
    def of(cls, causes: Mapping[str, Iterable[str]]) -> "Diagram":
        """Return the diagram with these nodes, each with the causes that have an arrow into it.

        Examples
        --------
        >>> diagram = Diagram.of({"u": [], "x": ["u"], "y": ["x", "u"]})
        >>> diagram.named(diagram.open_path({1}, {2}, given=frozenset()))
        ('x', 'y')
        """
        names = tuple(causes)
        numbers = {name: number for number, name in enumerate(names)}
        arrows = [(numbers[cause], numbers[name]) for name in names for cause in causes[name]]
        return cls._of_arrows(names, arrows, numbers)

    @classmethod
    def _of_arrows(
        cls, names: tuple[str, ...], arrows: Iterable[tuple[int, int]], numbers: Mapping[str, int]
    ) -> "Diagram":
        parents: list[list[int]] = [[] for _ in names]
        children: list[list[int]] = [[] for _ in names]
        for tail, head in arrows:
            parents[head].append(tail)
            children[tail].append(head)
        return cls(names, tuple(map(tuple, parents)), tuple(map(tuple, children)), numbers)

    # ----------------------------------------------------------------------------------- names

    def nodes(self, names: Iterable[str]) -> Nodes:
        """Return the nodes of these names."""
        return frozenset(self.numbers[name] for name in names)

    def named(self, nodes: Iterable[int]) -> tuple[str, ...]:
        """Return the names of these nodes, in their order."""
        return tuple(self.names[node] for node in nodes)

    def by_name(self, nodes: Iterable[int]) -> list[int]:
        """Return the nodes sorted by their names."""
        return sorted(nodes, key=self.names.__getitem__)

    # -------------------------------------------------------------------------------- relatives

    def ancestors(self, nodes: Iterable[int]) -> Nodes:
        """Return An(nodes): everything with a directed path into them, themselves included."""
        return _closure(nodes, self.parents.__getitem__)

    def descendants(self, nodes: Iterable[int]) -> Nodes:
        """Return De(nodes): everything with a directed path from them, themselves included."""
        return _closure(nodes, self.children.__getitem__)

    def causal_nodes(self, treatment: int, outcome: int) -> Nodes:
        """Return the nodes of directed paths from treatment to outcome, the treatment left out."""
        return (self.descendants([treatment]) - {treatment}) & self.ancestors([outcome])

    def moral_edges(self, nodes: Collection[int]) -> Iterator[tuple[int, int]]:
        """Return the edges of the moral graph on an ancestral set, each once, smaller node first.

        Every arrow loses its head, and the parents of a common child are joined
        (Lauritzen & Spiegelhalter 1988).
        """
        seen: set[tuple[int, int]] = set()
        for node in nodes:
            family = (node, *self.parents[node])
            for i, one in enumerate(family):
                for other in family[i + 1 :]:
                    edge = (min(one, other), max(one, other))
                    if edge not in seen:
                        seen.add(edge)
                        yield edge

    # ------------------------------------------------------------------------- arrows taken out

    def without(self, is_out: Callable[[int, int], bool]) -> "Diagram":
        """Return the diagram without the arrows (tail, head) that the question picks."""
        arrows = (
            (tail, head)
            for head, tails in enumerate(self.parents)
            for tail in tails
            if not is_out(tail, head)
        )
        return self._of_arrows(self.names, arrows, self.numbers)

    def without_arrows_out_of(self, nodes: Collection[int]) -> "Diagram":
        """Return G_-A: the diagram without arrows that leave one of the nodes."""
        return self.without(lambda tail, _: tail in nodes)

    def without_causal_arrows(self, treatment: int, outcome: int) -> "Diagram":
        """Return G_nc: the diagram without the first arrow of every directed path."""
        leading = self.ancestors([outcome])
        return self.without(lambda tail, head: tail == treatment and head in leading)

    # ------------------------------------------------------------------------------------ paths

    def open_path(
        self, starts: Collection[int], ends: Collection[int], given: Nodes
    ) -> Path | None:
        """Return a shortest d-connecting path from ``starts`` to ``ends``; None if there is none.

        A path is open given C if no inner node that it passes along or out of is in C, and every
        inner node where two of its arrowheads meet is in C or has a descendant there (Pearl 1988).
        A breadth-first walk over (node, way of arrival) finds one; a shortest open walk passes no
        node twice, since what it does between two visits can be left out.

        Parameters
        ----------
        starts, ends
            Nodes outside ``given``; a node in both counts as joined to itself.
        given
            What is conditioned on.
        """
        opened = self.ancestors(given)
        came_from: dict[tuple[int, int], tuple[int, int] | None] = {}
        queue: deque[tuple[int, int]] = deque()
        for start in sorted(starts):
            # As if come up from a child: every arrow may be taken.
            came_from[start, UP] = None
            queue.append((start, UP))
        while queue:
            state = queue.popleft()
            node, arrival = state
            if node in ends:
                return tuple(node for node, _ in _walked(state, came_from))
            for step in self._steps(node, arrival, given, opened):
                if step not in came_from:
                    came_from[step] = state
                    queue.append(step)
        return None

    def are_separated(self, starts: Collection[int], ends: Collection[int], given: Nodes) -> bool:
        """Say whether no path from ``starts`` to ``ends`` is open."""
        return self.open_path(starts, ends, given) is None

    def _steps(
        self, node: int, arrival: int, given: Nodes, opened: Nodes
    ) -> Iterator[tuple[int, int]]:
        if node not in given:
            yield from ((child, DOWN) for child in self.children[node])
        if (arrival == UP and node not in given) or (arrival == DOWN and node in opened):
            yield from ((parent, UP) for parent in self.parents[node])

    def directed_path(
        self, start: int, ends: Collection[int], avoiding: Collection[int] = ()
    ) -> Path | None:
        """Return a shortest directed path from ``start`` into ``ends``; None if there is none."""
        came_from: dict[int, int | None] = {start: None}
        queue = deque([start])
        while queue:
            node = queue.popleft()
            if node in ends:
                return tuple(_walked(node, came_from))
            for child in self.children[node]:
                if child not in came_from and (child not in avoiding or child in ends):
                    came_from[child] = node
                    queue.append(child)
        return None

    def colliders(self, path: Path) -> tuple[int, ...]:
        """Return the inner nodes of a path at which two of its arrowheads meet."""
        return tuple(
            node
            for before, node, behind in zip(path, path[1:], path[2:], strict=False)
            if before in self.parents[node] and behind in self.parents[node]
        )


def _closure(nodes: Iterable[int], neighbours: Callable[[int], tuple[int, ...]]) -> Nodes:
    found = set(nodes)
    stack = list(found)
    while stack:
        for node in neighbours(stack.pop()):
            if node not in found:
                found.add(node)
                stack.append(node)
    return frozenset(found)


def _walked(state: State, came_from: Mapping[State, State | None]) -> list[State]:
    walk = [state]
    while (before := came_from[walk[-1]]) is not None:
        walk.append(before)
    return walk[::-1]

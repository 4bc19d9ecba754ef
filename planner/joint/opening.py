"""A good study to begin with: from valid roles downhill, one change at a time.

The changes are to leave somebody out, to take somebody in, to swap the two, and to read somebody in
another way. Limits that are overstepped are mended first, then the score is lowered. No bound hangs
on this; the better the study it ends with, the sooner the search drops what is worse.
"""

from collections.abc import Iterable, Iterator
from dataclasses import replace
from math import inf

from planner.claims import Roles
from planner.deadline import Deadline
from planner.joint.space import Draft, Space

__all__ = ["downhill", "drafts_around"]


def downhill(space: Space, draft: Draft, deadline: Deadline) -> Draft:
    """Return a draft from which no change leads further down; or as far as time allows."""
    place = rank_of(space, draft)
    while deadline.left:
        for around in (drafts_around, swaps_around):
            best, found = lowest(space, around(space, draft), deadline)
            if best is not None and found < place:
                draft, place = best, found
                break
        else:
            return draft
    return draft


def rank_of(space: Space, draft: Draft) -> tuple[float, float]:
    """Return what is brought down: limits overstepped, then the score."""
    worth = space.weigh(draft)
    return worth.wrong, worth.score


def lowest(
    space: Space, drafts: Iterable[Draft], deadline: Deadline
) -> tuple[Draft | None, tuple[float, float]]:
    """Return the lowest of some drafts, of as many as there is time for."""
    best, place = None, (inf, inf)
    for each in drafts:
        found = rank_of(space, each)
        if found < place:
            best, place = each, found
        if not deadline.left:
            break
    return best, place


def drafts_around(space: Space, draft: Draft) -> Iterator[Draft]:
    """Return the valid drafts that one change leads to."""
    ways = dict(draft.ways)
    for node, rank in draft.ways:
        for other in range(len(space.ways[node])):
            if other != rank:
                yield Draft.of(draft.roles, {**ways, node: other})
    for roles in roles_around(space, draft.roles):
        if space.is_valid(roles):
            new = roles.nodes - draft.roles.nodes
            kept = {node: rank for node, rank in ways.items() if node not in draft.roles.nodes}
            kept |= {node: ways[node] for node in roles.nodes if node in ways}
            for node in new:
                kept[node] = 0
            yield Draft.of(roles, kept)
            for node in new:
                for rank in range(1, len(space.ways[node])):
                    yield Draft.of(roles, {**kept, node: rank})


def swaps_around(space: Space, draft: Draft) -> Iterator[Draft]:
    """Return the valid drafts with one covariate in place of another, in any of its ways."""
    claim, roles, ways = space.claim, draft.roles, dict(draft.ways)
    before = sorted(claim.before(frozenset(space.ways)) - roles.nodes)
    for gone in sorted(roles.covariates):
        left = {node: rank for node, rank in ways.items() if node != gone}
        for node in before:
            swapped = roles.without(gone).adjusting(node)
            if space.is_valid(swapped):
                for rank in range(len(space.ways[node])):
                    yield Draft.of(swapped, {**left, node: rank})


def roles_around(space: Space, roles: Roles) -> Iterator[Roles]:
    """Return the roles with one covariate or mediator more or less, or another instrument."""
    claim = space.claim
    able = space.route.criterion.candidates(claim, frozenset(space.ways))
    before = claim.before(frozenset(space.ways)) - roles.nodes
    for node in sorted(roles.covariates | roles.mediators):
        yield roles.without(node)
    for node in sorted(before):
        yield roles.adjusting(node)
    for node in sorted(able.mediators - roles.mediators):
        yield replace(roles, mediators=roles.mediators | {node})
    for node in sorted(able.instruments - roles.instruments):
        yield replace(roles, instruments=frozenset((node,)), covariates=roles.covariates - {node})

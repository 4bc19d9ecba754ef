"""The route by the mechanism: mediators that carry the whole effect."""

from planner.routes.mechanism.criterion import breaches, candidates
from planner.routes.mechanism.reasons import hindrances, left_out, needed, opened
from planner.routes.mechanism.rows import write_rows
from planner.routes.mechanism.words import WORDS
from planner.routes.route import Route

__all__ = ["MECHANISM"]

MECHANISM = Route(
    name="mechanism",
    candidates=candidates,
    breaches=breaches,
    write_rows=write_rows,
    opened=opened,
    needed=needed,
    left_out=left_out,
    hindrances=hindrances,
    words=WORDS,
)

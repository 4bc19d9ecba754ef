"""The route by an instrument."""

from planner.routes.instrument.criterion import breaches, candidates
from planner.routes.instrument.reasons import hindrances, left_out, needed, opened
from planner.routes.instrument.rows import write_rows
from planner.routes.instrument.words import WORDS
from planner.routes.route import Route

__all__ = ["INSTRUMENT"]

INSTRUMENT = Route(
    name="instrument",
    candidates=candidates,
    breaches=breaches,
    write_rows=write_rows,
    opened=opened,
    needed=needed,
    left_out=left_out,
    hindrances=hindrances,
    words=WORDS,
)

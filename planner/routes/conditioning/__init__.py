"""The route by conditioning on covariates."""

from planner.routes.conditioning.criterion import breaches, candidates
from planner.routes.conditioning.reasons import hindrances, left_out, needed, opened
from planner.routes.conditioning.rows import write_rows
from planner.routes.conditioning.words import WORDS
from planner.routes.route import Route

__all__ = ["CONDITIONING"]

CONDITIONING = Route(
    name="conditioning",
    candidates=candidates,
    breaches=breaches,
    write_rows=write_rows,
    opened=opened,
    needed=needed,
    left_out=left_out,
    hindrances=hindrances,
    words=WORDS,
)

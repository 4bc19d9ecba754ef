"""The route by conditioning on covariates."""

from planner.routes.conditioning import criterion, reasons, rows
from planner.routes.conditioning.words import WORDS
from planner.routes.route import Route

__all__ = ["CONDITIONING"]

CONDITIONING = Route(
    name="conditioning", criterion=criterion, rows=rows, reasons=reasons, words=WORDS
)

"""The route by the mechanism: mediators that carry the whole effect."""

from planner.routes.mechanism import criterion, reasons, rows
from planner.routes.mechanism.words import WORDS
from planner.routes.route import Route

__all__ = ["MECHANISM"]

MECHANISM = Route(name="mechanism", criterion=criterion, rows=rows, reasons=reasons, words=WORDS)

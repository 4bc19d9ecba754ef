"""The route by an instrument."""

from planner.routes.instrument import criterion, reasons, rows
from planner.routes.instrument.words import WORDS
from planner.routes.route import Route

__all__ = ["INSTRUMENT"]

INSTRUMENT = Route(name="instrument", criterion=criterion, rows=rows, reasons=reasons, words=WORDS)

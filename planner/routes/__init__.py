"""The routes to an effect, one folder each, in their usual order."""

from planner.routes.conditioning import CONDITIONING
from planner.routes.instrument import INSTRUMENT
from planner.routes.mechanism import MECHANISM
from planner.routes.route import Route, Words

__all__ = ["ROUTES", "Route", "Words"]

ROUTES = {route.name: route for route in (CONDITIONING, INSTRUMENT, MECHANISM)}

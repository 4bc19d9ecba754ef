"""The integer program: what is bought, what a route asks of it, and the cheapest answer.

The only package that knows the solver. A route writes its rows with four words: a ``Program`` to
write them in, and ``separated``, ``connected`` and ``cut`` for what paths must or must not do.
"""

from planner.program.connection import connected
from planner.program.cut import cut
from planner.program.model import Literal, Program, RoleLiterals, negation
from planner.program.separation import separated
from planner.program.solve import Choice, Found, NothingFound, Solved, cheapest_purchase
from planner.program.within import Within

__all__ = [
    "Choice",
    "Found",
    "Literal",
    "NothingFound",
    "Program",
    "RoleLiterals",
    "Solved",
    "Within",
    "cheapest_purchase",
    "connected",
    "cut",
    "negation",
    "separated",
]

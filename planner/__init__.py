"""The cheapest set of measurements that lets a study learn a causal effect.

``recommend(read_study("study.yaml")).as_dict()`` is what ``measurewise recommend --json`` prints.
"""

from collections.abc import Callable
from typing import TYPE_CHECKING

from costs.faults import FaultyInput
from planner.reading import read_study
from planner.study import Study
from planner.version import VERSION

if TYPE_CHECKING:
    from planner.plan import Recommendation

__all__ = ["FaultyInput", "Study", "read_study", "recommend"]
__version__ = VERSION


def recommend(
    study: Study, *, seconds: float = 60.0, report: Callable[[str], None] | None = None
) -> "Recommendation":
    """Return the cheapest plan of a study, with proof and reasons, and what every route would take.

    See ``planner.planning.recommend``, which is imported only when it is called.
    """
    from planner import planning  # noqa: PLC0415

    return planning.recommend(study, seconds=seconds, report=report or planning.tell_nobody)

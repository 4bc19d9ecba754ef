"""From a study file and its price lists to a ``Study``, or every fault of every file at once."""

from planner.reading.study_file import read_study

__all__ = ["read_study"]

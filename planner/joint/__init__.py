"""The cheapest study at a stated precision: set, ways and number of records chosen together.

``space`` says what a draft is worth, ``purse`` and the routes' ``bounds`` what no draft can beat,
``branch`` searches, ``opening`` begins, and ``study`` puts them together.
"""

from planner.joint.study import Extra, JointStudy, cheapest_study, weighed_up

__all__ = ["Extra", "JointStudy", "cheapest_study", "weighed_up"]

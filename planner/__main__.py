"""``python -m planner`` is ``measurewise``."""

from planner.cli import main

main()

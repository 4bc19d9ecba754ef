"""What a command loads: help and check are quick because they do without the heavy libraries."""

import subprocess
import sys

import pytest

from tests.conftest import ROOT

HEAVY = {"numpy", "networkx", "pandas", "ortools"}
PROGRAM = """
import sys
from planner.cli import main
try:
    main(sys.argv[1:])
except SystemExit as stopped:
    assert not stopped.code, stopped.code
print("LOADED", *sorted({name.split(".")[0] for name, module in sys.modules.items() if module}))
"""


def loaded(*words: str) -> set[str]:
    """The libraries that a fresh process has loaded after a command."""
    command = [sys.executable, "-c", PROGRAM, *words]
    ran = subprocess.run(command, cwd=ROOT, check=True, capture_output=True, text=True)
    return set(ran.stdout.rpartition("LOADED")[2].split())


@pytest.mark.parametrize(
    "words",
    [
        ("--help",),
        ("recommend", "--help"),
        ("check", "examples/tariff.yaml"),
        ("check", "examples/permits.yaml"),
        ("check", "examples/capsules.yaml"),
        ("check", "examples/capsules.yaml", "--json"),
    ],
    ids=" ".join,
)
def test_help_and_check_do_without_heavy_libraries(words: tuple[str, ...]) -> None:
    assert not loaded(*words) & HEAVY


def test_the_solver_is_loaded_to_recommend() -> None:
    """The test above can see a library that is there."""
    assert "ortools" in loaded("recommend", "examples/first_study.yaml")

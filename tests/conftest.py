"""What the tests share: study files made on the spot, and the command line as its user calls it."""

from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import pytest

from planner.cli import main

ROOT = Path(__file__).parents[1]
EXAMPLES = sorted((ROOT / "examples").glob("*.yaml"))
STUDY = """\
title: Does a call help?
currency: EUR
effect: {treatment: x, outcome: y}
size: {records: 40}
variables:
  x:
    caused_by: [c]
    per_unit: 1
  y:
    caused_by: {x: 0.3, c: -0.2}
    ways:
      ask: {per_unit: 0.50, takes: {minutes: 2}}
  c: {per_unit: 2, needs: [visit]}
components:
  visit: {setup: 10}
burdens:
  minutes: {limit: 20, price: 0.5}
"""
"""Without a fault; tests put one in."""


class Ran(NamedTuple):
    """What a run of the command line left behind."""

    code: int
    out: str
    err: str


@pytest.fixture
def write(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., Path]:
    """Write a file into an empty folder, in which the test then runs; returns its bare name."""
    monkeypatch.chdir(tmp_path)

    def written(text: str | bytes, name: str = "study.yaml") -> Path:
        content = text.encode() if isinstance(text, str) else text
        (tmp_path / name).write_bytes(content)
        return Path(name)

    return written


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Callable[..., Ran]:
    """Run the command line."""

    def ran(*words: str | Path) -> Ran:
        capsys.readouterr()
        with pytest.raises(SystemExit) as stopped:
            main([str(word) for word in words])
        out, err = capsys.readouterr()
        code = stopped.value.code
        return Ran(0 if code is None else int(code), out, err)

    return ran


def pytest_addoption(parser: pytest.Parser) -> None:
    """Pages that a person has read are renewed only when asked for."""
    parser.addoption(
        "--update-golden", action="store_true", help="accept the pages as they are now"
    )

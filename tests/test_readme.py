"""What README shows is what happens."""

import re
import tomllib
from collections.abc import Callable

import pytest

from tests.conftest import ROOT, Ran

README = ROOT / "README.md"
BLOCK = re.compile(r"```console\n\$ (.*?)\n(.*?)```", re.DOTALL)
CUT = "…\n"
"""Stands in a block where the page goes on, or runs on before the next part that is shown."""


def is_shown(parts: list[str], page: str) -> bool:
    """Whether a page begins with the first part, and holds the others in order."""
    at = 0
    for number, part in enumerate(parts):
        found = page.find(part, at)
        if found < 0 or (number == 0 and found > 0):
            return False
        at = found + len(part)
    return len(parts) > 1 or at == len(page)


def fresh(parts: list[str], page: str) -> str:
    """The same parts of a page as it is now: as many lines, from the same first line."""
    lines, at, renewed = page.splitlines(keepends=True), 0, []
    for part in parts:
        old = part.splitlines(keepends=True)
        at = lines.index(old[0], at) if old else at
        renewed.append("".join(lines[at : at + len(old)]))
    return CUT.join(renewed) if len(parts) > 1 else page


def shell_lines(text: str) -> list[str]:
    """The commands that set something up."""
    return re.findall(r"```sh\n(.*?)\n```", text, re.DOTALL)


def test_what_is_shown_is_what_happens(
    run: Callable[..., Ran], monkeypatch: pytest.MonkeyPatch, request: pytest.FixtureRequest
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.chdir(ROOT)
    text = README.read_text(encoding="utf-8")
    blocks = BLOCK.findall(text)
    assert len(blocks) == 5
    for command, shown in blocks:
        program, *words = command.split()
        assert program == "measurewise"
        ran = run(*words)
        page = ran.out or ran.err
        parts = shown.split(CUT)
        if request.config.getoption("--update-golden"):
            block = f"$ {command}\n{fresh(parts, page)}```"
            text = text.replace(f"$ {command}\n{shown}```", block)
        else:
            assert is_shown(parts, page), command
    if request.config.getoption("--update-golden"):
        README.write_text(text, encoding="utf-8")


def test_the_two_commands_are_one_line_each() -> None:
    example, tests = shell_lines(README.read_text(encoding="utf-8"))
    assert "\n" not in example + tests
    assert example.endswith("measurewise recommend examples/tariff.yaml")
    assert "pytest" in tests
    assert "README.md" in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


def test_every_option_and_command_is_in_the_readme(run: Callable[..., Ran]) -> None:
    text = README.read_text(encoding="utf-8")
    for option in set(re.findall(r"--[a-z-]+", run("recommend", "--help").out)) - {
        "--help",
        "--force",
    }:
        assert option in text, option
    for command in re.findall(r"^  ([a-z]+)  ", run("--help").out, re.MULTILINE):
        assert f"measurewise {command}" in text or f"`{command}`" in text, command


def test_the_study_in_the_readme_is_a_study(run: Callable[..., Ran], write: Callable) -> None:  # type: ignore[type-arg]
    (study,) = re.findall(r"```yaml\n(.*?)```", README.read_text(encoding="utf-8"), re.DOTALL)
    write("variable,way,per_unit\nworkload,register,0.02\n", "my_prices.csv")
    ran = run("check", write(study))
    assert (ran.code, ran.err) == (0, "")


def test_the_project_file_and_the_package_agree() -> None:
    import planner

    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["name"] == "measurewise"
    assert planner.__version__ == project["version"]


def test_the_top_level_holds_nothing_else() -> None:
    names = {path.name for path in ROOT.iterdir() if not path.name.startswith((".", "__"))}
    names -= {"build", "measurewise.egg-info"}
    assert names == {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "planner",
        "costs",
        "tests",
        "examples",
    }


def test_every_kind_of_reason_is_listed_for_developers() -> None:
    from planner.planning import NEVER
    from planner.routes import ROUTES
    from planner.words import SHARED

    listed = set(re.findall(r"`([a-z_]+)`", (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")))
    sentences = {key for route in ROUTES.values() for key in route.words.sentences} | set(SHARED)
    kinds = {key.partition(":")[0] for key in sentences} | NEVER
    assert kinds <= listed, kinds - listed

"""What README shows is what happens."""

import re
import tomllib
from collections.abc import Callable

import pytest

from tests.conftest import ROOT, Ran

README = ROOT / "README.md"
BLOCK = re.compile(r"```console\n\$ (.*?)\n(.*?)```", re.DOTALL)
CUT = "…\n"
"""A block that ends in this shows the beginning of a page."""


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
    assert len(blocks) == 4
    for command, shown in blocks:
        program, *words = command.split()
        assert program == "measurewise"
        ran = run(*words)
        page = ran.out or ran.err
        if request.config.getoption("--update-golden"):
            lines = len(shown.splitlines()) - 1 if shown.endswith(CUT) else 0
            fresh = "".join(page.splitlines(keepends=True)[:lines]) + CUT if lines else page
            text = text.replace(f"$ {command}\n{shown}```", f"$ {command}\n{fresh}```")
        elif shown.endswith(CUT):
            assert page.startswith(shown.removesuffix(CUT))
        else:
            assert page == shown
    if request.config.getoption("--update-golden"):
        README.write_text(text, encoding="utf-8")


def test_the_two_commands_are_one_line_each() -> None:
    example, tests = shell_lines(README.read_text(encoding="utf-8"))
    assert "\n" not in example + tests
    assert example.endswith("measurewise recommend examples/permits.yaml")
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

"""Who imports whom: the house is built from below, and each library is known in one place."""

import ast
from pathlib import Path

import pytest

from tests.conftest import ROOT

MODULES = sorted([*(ROOT / "planner").rglob("*.py"), *(ROOT / "costs").rglob("*.py")])
FLOORS = (
    ("costs.faults", "costs.money", "costs.prices"),
    ("costs.located", "costs.bill"),
    ("costs.files", "costs.tally", "costs.circles"),
    ("costs.workbooks",),
    ("costs.tables",),
    ("costs.reading",),
    ("planner.version", "planner.study", "planner.diagram", "planner.strengths"),
    ("planner.claims", "planner.findings", "planner.linear"),
    ("planner.precision", "planner.deadline"),
    ("planner.reasons", "planner.program", "planner.ranges"),
    ("planner.bounds",),
    ("planner.routes",),
    ("planner.joint",),
    ("planner.words", "planner.reading", "planner.checking", "planner.whatif", "planner.search"),
    ("planner.plan",),
    ("planner.limits",),
    ("planner.planning",),
    ("planner.report",),
    ("planner.cli",),
    ("planner.__main__",),
)
"""Each line may import those above it; what shares a line may not import each other."""
KNOWN_BY = {
    "ortools": ("planner/program/",),
    "typer": ("planner/cli.py",),
    "rich": ("planner/cli.py", "planner/report/terminal.py"),
    "openpyxl": ("costs/workbooks.py", "planner/report/workbook.py"),
    "numpy": (
        "planner/precision.py",
        "planner/ranges.py",
        "planner/bounds.py",
        "planner/joint/",
        "planner/routes/",
    ),
    "yaml": ("costs/files.py",),
}
"""Which files may import a library; no other library is used."""
OPENERS = ("costs/files.py", "planner/report/files.py", "planner/cli.py")
"""Where files are opened."""


def imports(path: Path) -> set[str]:
    """Every module that a file imports, wherever in the file."""
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: imports are written in full"
            found.add(str(node.module))
    return found


def name_of(path: Path) -> str:
    """The module of a file, as in ``planner.cli``."""
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def floor_of(module: str) -> int | None:
    """On which floor a module stands."""
    for number, names in enumerate(FLOORS):
        if any(module == name or module.startswith(f"{name}.") for name in names):
            return number
    return None


def room_of(module: str) -> str:
    """The name under which a module stands on its floor."""
    names = [name for names in FLOORS for name in names]
    return next(name for name in names if module == name or module.startswith(f"{name}."))


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_imports_point_down(path: Path) -> None:
    module = name_of(path)
    if module in {"planner", "costs"}:
        return
    own = floor_of(module)
    assert own is not None, f"{module} has no floor yet"
    for imported in imports(path):
        if imported.split(".")[0] in {"planner", "costs"} and imported != "planner":
            other = floor_of(imported)
            assert other is not None, f"{imported} has no floor"
            assert other < own or room_of(imported) == room_of(module), (
                f"{module} imports {imported}"
            )


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_costs_know_no_planner(path: Path) -> None:
    if name_of(path).startswith("costs"):
        assert not any(name.startswith("planner") for name in imports(path))


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_each_library_is_known_where_it_belongs(path: Path) -> None:
    import sys

    place = path.relative_to(ROOT).as_posix()
    for name in {each.split(".")[0] for each in imports(path)}:
        if name in {"planner", "costs"} or name in sys.stdlib_module_names:
            continue
        assert name in KNOWN_BY, f"{place} imports {name}"
        assert place.startswith(KNOWN_BY[name]), f"{place} imports {name}"


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_files_are_opened_in_few_places(path: Path) -> None:
    words = {"open", "read_bytes", "write_bytes", "unlink", "mkstemp"}
    used = {
        node.attr if isinstance(node, ast.Attribute) else node.id
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        if isinstance(node, ast.Attribute | ast.Name)
    }
    if path.relative_to(ROOT).as_posix() not in OPENERS:
        assert not words & used


def test_one_route_is_one_folder() -> None:
    folders = sorted(
        p for p in (ROOT / "planner" / "routes").iterdir() if p.is_dir() and p.name[0] != "_"
    )
    files = [sorted(file.name for file in folder.glob("*.py")) for folder in folders]
    assert [folder.name for folder in folders] == ["conditioning", "instrument", "mechanism"]
    assert (
        files
        == [
            [
                "__init__.py",
                "bounds.py",
                "criterion.py",
                "precision.py",
                "reasons.py",
                "rows.py",
                "words.py",
            ]
        ]
        * 3
    )

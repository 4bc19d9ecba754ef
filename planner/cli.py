"""The command line: each command reads, calls one function, reports.

Reports go to stdout, everything else to stderr. Exit 0: a plan; 1: no plan, reported in full; 2:
the input is at fault.
"""

import json
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from datetime import UTC, datetime
from functools import partial
from importlib import resources
from io import TextIOWrapper
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from costs.faults import Fault, Faults, FaultyInput, Spot
from planner import whatif
from planner.checking import Summary, left_unchecked, out_of_date, summary_of
from planner.reading import read_study
from planner.report.files import refuse_overwriting, write_whole
from planner.study import Study
from planner.version import VERSION

if TYPE_CHECKING:
    from planner.plan import Recommendation
    from planner.report.view import View

__all__ = ["app", "main"]

NO_PLAN, AT_FAULT = 1, 2
"""Exit codes."""

app = typer.Typer(
    name="measurewise",
    help="Find the cheapest measurements with which a study can learn an effect, and prove it.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

StudyFile = Annotated[Path, typer.Argument(metavar="STUDY", help="Study file (YAML).")]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document and nothing else.")]


def print_version(wanted: bool) -> None:  # noqa: FBT001 - typer hands the flag over by position
    """Print the version and stop, if it was asked for."""
    if wanted:
        typer.echo(f"measurewise {VERSION}")
        raise typer.Exit


@app.callback()
def measurewise(
    version: Annotated[
        bool,
        typer.Option("--version", callback=print_version, is_eager=True, help="Print the version."),
    ] = False,
) -> None:
    """Find the cheapest measurements with which a study can learn an effect, and prove it."""


@app.command()
def new(
    path: Annotated[Path, typer.Argument(metavar="STUDY", help="File to write.")] = Path(
        "study.yaml"
    ),
) -> None:
    """Write a commented study file to fill in."""
    refuse_overwriting(path, "new", "Name another file; an existing one is never replaced.")
    template = resources.files("planner").joinpath("new_study.yaml").read_bytes()
    write_whole(path, template, "new")
    say(f"{path} is written. Next: measurewise check {path}")


@app.command()
def check(study: StudyFile, as_json: AsJson = False) -> None:
    """Say what a study holds, or all that is wrong with it."""
    with numpy_left_out():
        summary = summary_of(read_study(study), datetime.now(tz=UTC).date())
    if as_json:
        print_json(summary.as_dict())
    else:
        print_summary(study, summary)


@app.command()
def recommend(
    study: StudyFile,
    as_json: AsJson = False,
    route: Annotated[
        list[str] | None,
        typer.Option(
            metavar="ROUTE",
            help="Allow this route only: conditioning, instrument or mechanism. Repeatable.",
        ),
    ] = None,
    records: Annotated[
        int | None,
        typer.Option(
            metavar="NUMBER", help="So many complete records, in place of the study's size."
        ),
    ] = None,
    without: Annotated[
        list[str] | None,
        typer.Option(
            metavar="NAME",
            help="A variable, VARIABLE.WAY or component that cannot be had. Repeatable.",
        ),
    ] = None,
    held: Annotated[
        list[str] | None,
        typer.Option(metavar="VARIABLE.WAY", help="A reading already in hand, free. Repeatable."),
    ] = None,
    prices: Annotated[
        list[Path] | None,
        typer.Option(metavar="FILE", help="Price list in place of the study's. Repeatable."),
    ] = None,
    workbook: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Write measurement list and bill to this XLSX file."),
    ] = None,
    force: Annotated[bool, typer.Option("--force", help="Replace files that are there.")] = False,
    seconds: Annotated[
        float, typer.Option(min=0.1, metavar="NUMBER", help="Time for each route.")
    ] = 60.0,
) -> None:
    """Find the cheapest plan, prove it, and give reasons."""
    original = read_study(study, prices=prices)
    if workbook is not None:
        refuse_workbook(workbook, original, force=force)
    changed = what_if(original, route, records, without, held)
    for remark in (*left_unchecked(changed), *out_of_date(changed, datetime.now(tz=UTC).date())):
        say(f"note: {remark}")
    # Imported here, so that help and check do without the solver and the layout of reports.
    from rich.console import Console  # noqa: PLC0415

    from planner.planning import recommend as recommended  # noqa: PLC0415
    from planner.report.terminal import print_report  # noqa: PLC0415
    from planner.report.view import view_of  # noqa: PLC0415

    with progress() as report:
        answer = recommended(changed, seconds=seconds, report=report)
    view = view_of(answer)
    # Files first: whoever looks at the top of the report only has them all the same.
    if workbook is not None:
        write_workbook(workbook, view, answer)
    if as_json:
        print_json(answer.as_dict())
    else:
        print_report(view, Console())
    if answer.buy is None:
        raise typer.Exit(NO_PLAN)


def write_workbook(path: Path, view: "View", answer: "Recommendation") -> None:
    """Write the workbook of a plan, and say so; where there is no plan, say that."""
    if answer.buy is None:
        say(f"There is no plan, so {path} is not written.")
        return
    from planner.report.workbook import workbook_bytes  # noqa: PLC0415

    write_whole(path, workbook_bytes(view, answer.study, answer.buy), "--workbook")
    say(f"{path} is written.")


def refuse_workbook(path: Path, study: Study, *, force: bool) -> None:
    """Refuse a place for the workbook where none can, or should, be written."""
    inputs = [study.path, *(source.path for source in study.price_sources)]
    mend = "Name another file, or add --force to replace an ordinary one."
    refuse_overwriting(path, "--workbook", mend, force=force, inputs=inputs)
    if path.suffix.lower() != ".xlsx":
        wrong, mend = "is no name of a workbook.", "Let it end in .xlsx."
        fault = Fault(file=str(path), spot=Spot(1), key="--workbook", wrong=wrong, mend=mend)
        raise FaultyInput([fault])


def what_if(
    study: Study,
    routes: Sequence[str] | None,
    records: int | None,
    without: Sequence[str] | None,
    held: Sequence[str] | None,
) -> Study:
    """Return the study with what the options ask for; all that cannot be is told at once."""
    changes: list[Callable[[Study], Study]] = []
    if routes:
        changes.append(lambda study: whatif.with_routes(study, routes))
    if records is not None:
        changes.append(lambda study: whatif.with_records(study, records))
    changes += [partial(whatif.without, name=name) for name in without or ()]
    changes += [partial(whatif.held, name=name) for name in held or ()]
    faults = Faults()
    for change in changes:
        try:
            study = change(study)
        except FaultyInput as faulty:
            for fault in faulty.faults:
                faults.add(fault)
    faults.raise_any()
    return study


def print_json(values: dict[str, object]) -> None:
    """Print one JSON document."""
    typer.echo(json.dumps(values, ensure_ascii=False, indent=2, allow_nan=False))


def print_summary(path: Path, summary: Summary) -> None:
    """Print what a study holds."""
    unmeasurable = summary.variables - summary.measurable
    implied = "" if summary.effect is None else f"{summary.effect:.3g} {summary.effect_unit}"
    rows = {
        "effect": f"{summary.treatment} on {summary.outcome}",
        **({"implied effect": implied} if implied else {}),
        "size": summary.size,
        "variables": f"{summary.variables:,}: {summary.measurable:,} measurable, {unmeasurable:,}"
        f" not; {summary.hidden_common_causes:,} hidden common causes",
        "arrows": f"{summary.arrows:,}, {summary.arrows_with_strength:,} of them with a strength",
        "prices": f"{summary.ways:,} ways of measuring, all priced, {summary.free_ways:,} with no"
        f" price of their own; {summary.components:,} components",
        "timing": f"{summary.timed:,} variables with a time: {', '.join(summary.times)}"
        if summary.timed
        else "no times given",
    }
    width = max(map(len, rows)) + 2
    typer.echo(f"{path}: no faults.")
    typer.echo(summary.title)
    for heading, text in rows.items():
        typer.echo(f"  {heading:<{width}}{text}")
    if summary.remarks:
        typer.echo("Worth a second look:")
        for remark in summary.remarks:
            typer.echo(f"  - {remark}")


@contextmanager
def numpy_left_out() -> Iterator[None]:
    """Leave numpy out of the process: the workbook library looks for it, only to know its numbers.

    None of ours are, and loading it takes as long as all the rest of the check.
    """
    if "numpy" in sys.modules:
        yield
        return
    sys.modules["numpy"] = None  # type: ignore[assignment]  # makes the import fail, as documented
    try:
        yield
    finally:
        del sys.modules["numpy"]


@contextmanager
def progress() -> Iterator[Callable[[str], None]]:
    """Show what is being worked on, on stderr, where that is a terminal."""
    if not sys.stderr.isatty():
        yield lambda _: None
        return
    from rich.console import Console  # noqa: PLC0415

    with Console(stderr=True).status("measurewise") as status:
        yield lambda text: status.update(f"Searching {text} …")


def say(text: str) -> None:
    """Say something that is no report."""
    typer.echo(text, err=True)


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line; what is at fault in the input is printed whole."""
    for stream in (sys.stdout, sys.stderr):
        # Arrows and names need it; where a console knows less, it shows something else for them.
        if isinstance(stream, TextIOWrapper) and not stream.encoding.lower().startswith("utf"):
            stream.reconfigure(encoding="utf-8")
    try:
        app(args=None if arguments is None else list(arguments))
    except FaultyInput as faulty:
        say(str(faulty))
        sys.exit(AT_FAULT)
    except OSError as error:
        say(f"The report cannot be written: {error.strerror}.")
        sys.exit(AT_FAULT)

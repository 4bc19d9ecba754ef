"""The report on a terminal: what to do first, then why, then what was left out.

Text of the user is never read as markup. Everything is legible without colour: headings are in
capitals, and nothing is said by colour alone.
"""

from collections.abc import Iterable, Sequence

from rich.cells import cell_len
from rich.console import Console, Group, JustifyMethod, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from planner.report.rows import Note, RouteRow
from planner.report.view import View

__all__ = ["print_report", "report"]

INDENT = (0, 0, 0, 2)
MOST_CELLS = 22
"""A name longer than this is folded."""
LEGEND = "a → b: a acts on b. What stands in brackets cannot be measured."
PARTS = {
    "treatment": "treatment and outcome",
    "outcome": "treatment and outcome",
    "instrument": "instrument",
    "mediator": "mediators (the mechanism)",
    "covariate": "covariates (to adjust for)",
    "component": "components (shared costs)",
}
"""The heading under which each part stands in the list of purchases."""


def print_report(view: View, console: Console) -> None:
    """Print a report, without the blanks that fill up its lines."""
    with console.capture() as captured:
        console.print(report(view), markup=False, highlight=False)
    for line in captured.get().splitlines():
        console.file.write(line.rstrip() + "\n")


def report(view: View) -> Group:
    """Return a whole report; sections with nothing in them are left out."""
    beyond = f" (the plan beyond the limits, by {view.shown_plan})" if view.shown_plan else ""
    sections: list[tuple[str, list[RenderableType]]] = [
        ("ANSWER", paragraphs(view.answer)),
        (f"WHAT TO BUY{beyond}", [Text(LEGEND), purchases(view)] if view.bought else []),
        ("DO NOT ADJUST FOR", [named(view.never)] if view.never else []),
        ("WHAT IT LEANS ON", bullets(view.leans_on)),
        ("TAKE CARE", bullets(view.cautions)),
        ("WHAT ONE UNIT BEARS", [named(view.burdens)] if view.burdens else []),
        (f"THE BILL{beyond}", [bill(view)] if view.bill else []),
        ("THE ROUTES SIDE BY SIDE", [side_by_side(view.routes)]),
        ("WHY EACH ROUTE IS OPEN OR NOT", [reasons(view.routes)]),
        ("MEASURABLE, BUT NOT NEEDED", [named(view.left_out)] if view.left_out else []),
        ("ALSO GOOD TO KNOW", bullets(view.notes)),
    ]
    parts: list[RenderableType] = [Text(view.title, style="bold"), Text(view.subject)]
    for heading, body in sections:
        if body:
            parts += [
                Text(),
                Text(heading, style="bold"),
                *(Padding(each, INDENT) for each in body),
            ]
    return Group(*parts)


def paragraphs(lines: Iterable[str]) -> list[RenderableType]:
    """Return a line of text each."""
    return [Text(line) for line in lines]


def bullets(lines: Iterable[str]) -> list[RenderableType]:
    """Return a list, one entry a line, wrapped under its own first letter."""
    entries = list(lines)
    if not entries:
        return []
    table = Table.grid(padding=(0, 1, 0, 0))
    for line in entries:
        table.add_row(Text("-"), Text(line))
    return [table]


def named(notes: Iterable[Note]) -> Table:
    """Return names with what is said of them."""
    table = Table.grid(padding=(0, 2, 0, 0))
    table.add_column(overflow="fold", max_width=24)
    table.add_column(overflow="fold")
    for note in notes:
        table.add_row(Text(note.name), Text(note.text))
    return table


def purchases(view: View) -> Group:
    """Return what is bought: a line of figures for each, then how it is done and why; the sum."""
    heads = ("", "way", "units", "each unit", "set-up", f"in all {view.currency}".strip())
    figures = [
        (f"  {row.name}", row.way, row.units, row.each, row.once, row.amount) for row in view.bought
    ]
    sums = [(note.name, "", "", "", "", note.text) for note in view.sums]
    widths = [
        min(max(map(cell_len, column)), MOST_CELLS)
        for column in zip(heads, *figures, *sums, strict=True)
    ]
    parts: list[RenderableType] = [figures_line(heads, widths, "italic")]
    part = ""
    for row, cells in zip(view.bought, figures, strict=True):
        if PARTS[row.part] != part:
            part = PARTS[row.part]
            parts.append(Text(part, style="italic"))
        parts.append(figures_line(cells, widths, "bold"))
        about = ": ".join(filter(None, (row.how, row.why)))
        parts.append(Padding(Text(about), (0, 0, 0, 4)))
    return Group(*parts, *(figures_line(cells, widths, "bold") for cells in sums))


def figures_line(cells: Sequence[str], widths: Sequence[int], style: str) -> Table:
    """Return one line of figures; numbers stand to the right of their column."""
    table = Table.grid(padding=(0, 1, 0, 0))
    for number, width in enumerate(widths):
        justify: JustifyMethod = "left" if number < 2 else "right"
        table.add_column(width=width, overflow="fold", justify=justify)
    table.add_row(*(Text(cell, style=style) for cell in cells))
    return table


def bill(view: View) -> Table:
    """Return the bill, line by line; columns in which nothing stands are left out."""
    columns = {
        "units": [row.units for row in view.bill],
        "set-up": [row.setup for row in view.bill],
        "per unit": [row.per_unit for row in view.bill],
        "batches": [row.batches for row in view.bill],
        "burdens": [row.burdens for row in view.bill],
        f"amount {view.currency}".strip(): [row.amount for row in view.bill],
    }
    shown = {heading: cells for heading, cells in columns.items() if any(cells)}
    table = Table(box=None, padding=(0, 1, 0, 0), show_edge=False, header_style="italic")
    table.add_column("line", overflow="fold", min_width=12)
    for heading in shown:
        table.add_column(heading, justify="right", no_wrap=True)
    for number, row in enumerate(view.bill):
        last = number == len(view.bill) - 1
        cells = [Text(cells[number]) for cells in shown.values()]
        table.add_row(Text(row.name), *cells, style="bold" if last else "")
    return table


def side_by_side(routes: Iterable[RouteRow]) -> Table:
    """Return the routes beside each other."""
    routes = list(routes)
    table = Table(box=None, padding=(0, 2, 0, 0), show_edge=False, header_style="italic")
    table.add_column("")
    for route in routes:
        table.add_column(route.name, overflow="fold", ratio=1)
    for heading, cells in (
        ("status", [route.status for route in routes]),
        ("total", [route.total for route in routes]),
        ("each unit", [route.each for route in routes]),
        ("set-up", [route.once for route in routes]),
        ("variables", [route.variables for route in routes]),
        ("estimates", [route.estimand for route in routes]),
        ("leans on", ["\n".join(f"- {clause}" for clause in route.leans_on) for route in routes]),
    ):
        table.add_row(Text(heading), *(Text(cell) for cell in cells))
    return table


def reasons(routes: Iterable[RouteRow]) -> Group:
    """Return why each route is open or not, with what shows it."""
    parts: list[RenderableType] = []
    for route in routes:
        parts.append(Text(f"{route.name}: {route.reason}"))
        parts += [Padding(each, INDENT) for each in bullets(route.witnesses)]
    return Group(*parts)

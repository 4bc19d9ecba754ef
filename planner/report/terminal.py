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
GAP = 2
"""Blanks between columns of figures."""
LEAST_WIDTH = 60
"""Narrower windows get lines of this length."""
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
    """Print a report, without the blanks that fill up its lines.

    Where the window is narrower than a table of figures, lines are longer than the window: a digit
    is never left out.
    """
    console.width = max(console.width, LEAST_WIDTH, needed_width(view))
    with console.capture() as captured:
        console.print(report(view), markup=False, highlight=False)
    for line in captured.get().splitlines():
        console.file.write(line.rstrip() + "\n")


def needed_width(view: View) -> int:
    """Return the cells that the widest table of figures takes."""
    tables = (purchase_columns(view), bill_columns(view))
    return max(2 + sum(columns.values()) + GAP * len(columns) for columns in tables)


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
        ("THE ROUTES SIDE BY SIDE", [side_by_side(view)] if view.routes else []),
        ("WHY EACH ROUTE IS OPEN OR NOT", [reasons(view.routes)] if view.routes else []),
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


def purchase_figures(view: View) -> list[tuple[str, ...]]:
    """Return the heading and the lines of figures of what is bought, and of its sum."""
    heads = ("", "way", "units", "each unit", "set-up", f"in all {view.currency}".strip())
    rows = [
        (f"  {row.name}", row.way, row.units, row.each, row.once, row.amount) for row in view.bought
    ]
    sums = [(note.name, "", "", "", "", note.text) for note in view.sums]
    return [heads, *rows, *sums]


def purchase_columns(view: View) -> dict[int, int]:
    """Return how wide each column of what is bought is; long names are folded."""
    widths = {at: max(map(cell_len, cells)) for at, cells in columns(purchase_figures(view))}
    return {at: min(width, MOST_CELLS) if at < 2 else width for at, width in widths.items()}


def columns(rows: Sequence[Sequence[str]]) -> Iterable[tuple[int, tuple[str, ...]]]:
    """Return the columns of some rows, by number."""
    return enumerate(zip(*rows, strict=True))


def purchases(view: View) -> Group:
    """Return what is bought: a line of figures for each, then how it is done and why; the sum."""
    widths = list(purchase_columns(view).values())
    heads, *figures = purchase_figures(view)
    parts: list[RenderableType] = [figures_line(heads, widths, "italic")]
    part = ""
    for row, cells in zip(view.bought, figures, strict=False):
        if PARTS[row.part] != part:
            part = PARTS[row.part]
            parts.append(Text(part, style="italic"))
        parts.append(figures_line(cells, widths, "bold"))
        about = ": ".join(filter(None, (row.how, row.why)))
        parts.append(Padding(Text(about), (0, 0, 0, 4)))
    sums = figures[len(view.bought) :]
    return Group(*parts, *(figures_line(cells, widths, "bold") for cells in sums))


def figures_line(
    cells: Sequence[str], widths: Sequence[int], style: str, *, names: int = 2
) -> Table:
    """Return one line: some names, then numbers, which stand to the right of their column."""
    table = Table.grid(padding=(0, GAP, 0, 0))
    for number, width in enumerate(widths):
        justify: JustifyMethod = "left" if number < names else "right"
        table.add_column(width=width, overflow="fold", justify=justify)
    table.add_row(*(Text(cell, style=style) for cell in cells))
    return table


def bill_figures(view: View) -> list[tuple[str, ...]]:
    """Return the heading and the lines of the bill, without columns in which nothing stands."""
    heads = ("line", "units", "set-up", "per unit", "batches", "burdens")
    rows = [
        (row.name, row.units, row.setup, row.per_unit, row.batches, row.burdens, row.amount)
        for row in view.bill
    ]
    full = [(*heads, f"amount {view.currency}".strip()), *rows]
    kept = [at for at, (_, *cells) in columns(full) if any(cells)]
    return [tuple(row[at] for at in kept) for row in full]


def bill_columns(view: View) -> dict[int, int]:
    """Return how wide each column of the bill is; long names are folded."""
    widths = {at: max(map(cell_len, cells)) for at, cells in columns(bill_figures(view))}
    return {at: min(width, MOST_CELLS) if at == 0 else width for at, width in widths.items()}


def bill(view: View) -> Group:
    """Return the bill, line by line."""
    widths = list(bill_columns(view).values())
    heads, *lines, total = bill_figures(view)
    return Group(
        figures_line(heads, widths, "italic", names=1),
        *(figures_line(cells, widths, "", names=1) for cells in lines),
        figures_line(total, widths, "bold", names=1),
    )


def side_by_side(view: View) -> Table:
    """Return the routes beside each other."""
    routes = view.routes
    # Beside a total that holds surcharges, what goes into it is before them.
    direct = ", direct" if len(view.sums) > 1 else ""
    table = Table(box=None, padding=(0, 2, 0, 0), show_edge=False, header_style="italic")
    table.add_column("")
    for route in routes:
        table.add_column(Text(route.name), overflow="fold", ratio=1)
    for heading, cells in (
        ("status", [route.status for route in routes]),
        ("total", [route.total for route in routes]),
        (f"each unit{direct}", [route.each for route in routes]),
        (f"set-up{direct}", [route.once for route in routes]),
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

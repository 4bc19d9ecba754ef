"""The report on a terminal: what to do first, then why, then what was left out.

Text of the user is never read as markup. Everything is legible without colour: headings are in
capitals, and nothing is said by colour alone.
"""

from collections.abc import Collection, Iterable, Sequence

from rich.cells import cell_len
from rich.console import Console, Group, JustifyMethod, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from planner.report.rows import Bought, Note, RouteRow
from planner.report.view import View

__all__ = ["print_report", "report"]

INDENT = (0, 0, 0, 2)
GLUE = "\ufdd0"
"""Holds a number and its sign together when lines are wrapped; no text has this character."""
HEADING_CELLS = 22
"""Longer headings of the comparison run over two lines."""
NOTHING = "–"
MOST_CELLS = 22
"""A name longer than this is folded."""
GAP, LEAST_GAP = 2, 1
"""Blanks between columns of figures, and where a table would not fit otherwise."""
USUAL_WIDTH = 80
LEAST_WIDTH = 60
"""Narrower windows get lines of this length."""
LEGEND = "a → b: a acts on b. What stands in brackets cannot be measured."
PARTS = {
    "treatment": "treatment and outcome",
    "outcome": "treatment and outcome",
    "instrument": "instrument",
    "mediator": "mediators (the mechanism)",
    "covariate": "covariates (to adjust for)",
    "extra": "extras (any one of them could go, not all)",
    "component": "components (shared costs)",
}
"""The heading under which each part stands in the list of purchases, in this order."""


def print_report(view: View, console: Console) -> None:
    """Print a report, without the blanks that fill up its lines.

    Where the window is narrower than a table of figures, lines are longer than the window: a digit
    is never left out.
    """
    console.width = max(console.width, LEAST_WIDTH, needed_width(view))
    with console.capture() as captured:
        console.print(report(view), markup=False, highlight=False)
    for line in captured.get().replace(GLUE, " ").splitlines():
        console.file.write(line.rstrip() + "\n")


def needed_width(view: View) -> int:
    """Return the cells that the widest table of figures takes."""
    tables = (purchase_columns(view), bill_columns(view))
    return max(width_of(columns.values(), gap_of(columns.values())) for columns in tables)


def width_of(widths: Collection[int], gap: int) -> int:
    """Return the cells that a table of figures takes, its indent included."""
    return 2 + sum(widths) + gap * (len(widths) - 1)


def gap_of(widths: Collection[int]) -> int:
    """Return how far apart the columns of a table of figures stand."""
    return GAP if width_of(widths, GAP) <= USUAL_WIDTH else LEAST_GAP


def report(view: View) -> Group:
    """Return a whole report; sections with nothing in them are left out."""
    beyond = f" (the plan beyond the limits, by {view.shown_plan})" if view.shown_plan else ""
    sections: list[tuple[str, list[RenderableType]]] = [
        ("ANSWER", paragraphs(view.answer)),
        (f"WHAT THE PRICE LEANS ON{beyond}", bullets(view.leans_on)),
        ("TAKE CARE", bullets(view.cautions)),
        ("THE ROUTES SIDE BY SIDE", side_by_side(view) if view.routes else []),
        (f"WHAT TO BUY{beyond}", [Text(LEGEND), purchases(view)] if view.bought else []),
        ("DO NOT ADJUST FOR", [named(view.never)] if view.never else []),
        ("WHAT ONE UNIT BEARS", [named(view.burdens)] if view.burdens else []),
        (f"THE BILL{beyond}", [bill(view)] if view.bill else []),
        (
            "WHY EACH ROUTE IS OPEN OR NOT, AND WHAT IT LEANS ON",
            [reasons(view.routes)] if view.routes else [],
        ),
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


def prose(text: str) -> Text:
    """Return text that is wrapped, but not between a number and its sign."""
    return Text(text.replace(" %", f"{GLUE}%").replace("± ", f"±{GLUE}"))


def paragraphs(lines: Iterable[str]) -> list[RenderableType]:
    """Return a line of text each."""
    return [prose(line) for line in lines]


def bullets(lines: Iterable[str]) -> list[RenderableType]:
    """Return a list, one entry a line, wrapped under its own first letter."""
    entries = list(lines)
    if not entries:
        return []
    table = Table.grid(padding=(0, 1, 0, 0))
    for line in entries:
        table.add_row(Text("-"), prose(line))
    return [table]


def named(notes: Iterable[Note]) -> Table:
    """Return names with what is said of them."""
    table = Table.grid(padding=(0, 2, 0, 0))
    table.add_column(overflow="fold", max_width=24)
    table.add_column(overflow="fold")
    for note in notes:
        table.add_row(Text(note.name), prose(note.text))
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
    lines = list(zip(view.bought, figures, strict=False))
    order = list(PARTS)
    for row, cells in sorted(lines, key=lambda line: order.index(part_of(line[0]))):
        if PARTS[part_of(row)] != part:
            part = PARTS[part_of(row)]
            parts.append(Text(part, style="italic"))
        parts.append(figures_line(cells, widths, "bold"))
        about = ": ".join(filter(None, (row.how, row.why)))
        parts.append(Padding(prose(about), (0, 0, 0, 4)))
    sums = figures[len(view.bought) :]
    return Group(*parts, *(figures_line(cells, widths, "bold") for cells in sums))


def part_of(row: Bought) -> str:
    """Return under which heading a purchase stands."""
    return "extra" if row.is_extra else row.part


def figures_line(
    cells: Sequence[str], widths: Sequence[int], style: str, *, names: int = 2
) -> Table:
    """Return one line: some names, then numbers, which stand to the right of their column."""
    table = Table.grid(padding=(0, gap_of(widths), 0, 0))
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


def side_by_side(view: View) -> list[RenderableType]:
    """Return the routes beside each other; a line in which nothing stands is left out."""
    table = Table(box=None, padding=(0, GAP, 0, 0), show_edge=False, header_style="italic")
    table.add_column("", overflow="fold", width=HEADING_CELLS)
    for route in view.routes:
        table.add_column(Text(route.name), overflow="fold", ratio=1)
    for heading, cells in comparison(view):
        if any(cells):
            table.add_row(prose(heading), *(prose(cell or NOTHING) for cell in cells))
    known = any(route.half_width for route in view.routes)
    return [table, Text(f"Intervals are in {view.effect_unit}.")] if known else [table]


def comparison(view: View) -> Iterable[tuple[str, list[str]]]:
    """Return the lines of the comparison: plain words, the technical one in brackets."""
    # Beside a total that holds surcharges, what goes into it is before them.
    direct = ", direct" if len(view.sums) > 1 else ""
    routes = view.routes
    yield "status", [route.status for route in routes]
    yield "total", [route.total for route in routes]
    yield f"each unit{direct}", [route.each for route in routes]
    yield f"set-up{direct}", [route.once for route in routes]
    yield "variables", [route.variables for route in routes]
    yield "complete records", [route.records for route in routes]
    yield "units started", [route.started for route in routes]
    yield f"{view.interval} (half-width)", [route.half_width for route in routes]
    yield "chance to detect the effect (power)", [route.power for route in routes]
    yield "interval holds the effect (coverage)", [route.coverage for route in routes]
    yield "bias by poor readings, up to about", [route.bias for route in routes]
    yield "  largest alone", [route.worst for route in routes]
    yield "instrument's strength (first-stage F)", [route.first_stage for route in routes]
    yield "estimates", [route.estimand for route in routes]


def reasons(routes: Iterable[RouteRow]) -> Group:
    """Return why each route is open or not, with what shows it, and what it would lean on."""
    parts: list[RenderableType] = []
    for route in routes:
        parts.append(prose(f"{route.name}: {route.reason}"))
        parts += [Padding(each, INDENT) for each in bullets(route.witnesses)]
        if route.leans_on:
            parts.append(Text("Its price leans on"))
            parts += [Padding(each, INDENT) for each in bullets(route.leans_on)]
    return Group(*parts)

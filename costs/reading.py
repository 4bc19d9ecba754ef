"""Price lists, from YAML, CSV and XLSX, and from the study file itself, to one ``PriceList``.

Reading goes in two steps. Each place where something can be bought becomes a ``Listed``, with its
line; all of them together become a ``PriceList``, and only then can be said which names are
unknown, given twice, or need each other in a circle.
"""

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import date
from fractions import Fraction
from pathlib import Path
from typing import Any

from costs.circles import circles, spelt_out
from costs.faults import Faults
from costs.files import START, NamedFile, fault_of, read_file, yaml_tree
from costs.located import Located, shortened
from costs.prices import STANDARD, TEXTS, Batch, Burden, Component, PriceList, Way
from costs.tables import MEANT, Row, csv_rows, xlsx_rows

__all__ = [
    "Listed",
    "PriceFile",
    "combined",
    "listed_component",
    "listed_way",
    "read_burdens",
    "read_price_file",
]

PRICE_KEYS = ("per_unit", "setup", "batch", "needs")
"""A price counts as given when one of these is there."""
WAY_KEYS = ("label", *PRICE_KEYS, "takes", "reliability", "yields", "care", *TEXTS)
COMPONENT_KEYS = (*(key for key in WAY_KEYS if key != "reliability"), "always")
LATER_WAY_KEYS = ("on", "tiers", "weeks")
LATER_COMPONENT_KEYS = (*LATER_WAY_KEYS, "cuts")
PRICE_PLACES = 4
TAKES_PLACES = 2
MOST_TAKEN = 10**9
"""No unit bears more of a burden than this."""


@dataclass(frozen=True, slots=True)
class Listed:
    """A way or a component, where it stands, and the names in it that are still to be looked up."""

    name: str
    variable: str
    """The variable that a way measures; empty for a component."""
    purchase: Way | Component
    place: Located
    needs: Mapping[str, Located]
    takes: Mapping[str, Located]


@dataclass(frozen=True, slots=True)
class PriceFile:
    """What one price-list file says."""

    file: NamedFile
    listed: tuple[Listed, ...]
    currency: Located | None = None
    valid_until: date | None = None
    unread: tuple[str, ...] = ()
    """Sheets of a workbook that hold something, but no price table."""


def read_price_file(path: Path, faults: Faults) -> PriceFile | None:
    """Return what the file at ``path`` says; None, with faults, where it cannot be read at all."""
    readers: dict[str, Callable[[NamedFile, Faults], PriceFile]] = {
        ".yaml": yaml_prices,
        ".yml": yaml_prices,
        ".csv": csv_prices,
        ".xlsx": xlsx_prices,
    }
    reader = readers.get(path.suffix.lower())
    if reader is None:
        mend = f"Name a file that ends in {', '.join(readers)}."
        faults.add(fault_of(path, START, "is no price list of a known kind.", mend))
        return None
    file = read_file(path, faults)
    return None if file is None else reader(file, faults)


def yaml_prices(file: NamedFile, faults: Faults) -> PriceFile:
    """Read ``{currency, valid_until, ways: {variable: {way: {…}}}, components: {…}}``."""
    tree = yaml_tree(file, faults)
    keys = ("currency", "valid_until", "ways", "components")
    found = tree.entries(keys, meant=MEANT) if tree else {}
    listed = [
        listed_way(variable, name, place)
        for variable, ways in named_in(found, "ways")
        for name, place in ways.named().items()
    ]
    listed += [listed_component(name, place) for name, place in named_in(found, "components")]
    until = found.get("valid_until")
    valid = read_date(until) if until else None
    return PriceFile(file, tuple(listed), found.get("currency"), valid)


def named_in(found: Mapping[str, Located], key: str) -> Iterable[tuple[str, Located]]:
    """Return the named entries below a key, none where the key is not there."""
    return found[key].named().items() if key in found else ()


def read_date(place: Located) -> date | None:
    """Return a date written 2026-12-31."""
    text = place.text() or ""
    try:
        return date.fromisoformat(text.strip())
    except ValueError:
        place.fault(f"is {place.shown}, which is no date.", "Write it like 2026-12-31.")
        return None


def csv_prices(file: NamedFile, faults: Faults) -> PriceFile:
    """Read rows that each name a variable (and a way) or a component."""
    rows = csv_rows(file, faults)
    return PriceFile(file, tuple(each for row in rows for each in listed_in_row(row)))


def xlsx_prices(file: NamedFile, faults: Faults) -> PriceFile:
    """Read the same rows from the sheets of a workbook."""
    rows, unread = xlsx_rows(file, faults)
    listed = tuple(each for row in rows for each in listed_in_row(row))
    return PriceFile(file, listed, unread=unread)


def listed_in_row(row: Row) -> Iterator[Listed]:
    """Return the way or the component that a row lists; none, with a fault, if it names neither."""
    variable, way, component = (row.cell(column) for column in ("variable", "way", "component"))
    place = row.entry("row")
    if (variable is None) == (component is None):
        both = (
            "both a variable and a component" if variable else "neither a variable nor a component"
        )
        place.fault(f"names {both}.", "Name one of the two.")
    elif variable is not None:
        name = way.name() if way else STANDARD
        of = variable.name()
        if name and of:
            yield listed_way(of, name, row.entry(f"{of}.{name}"))
    elif component is not None:
        name = component.name()
        if way:
            way.fault("names a way of a component.", "Leave the way empty, or name a variable.")
        if name:
            yield listed_component(name, row.entry(name))


def listed_way(variable: str, name: str, place: Located) -> Listed:
    """Read one way of measuring a variable."""
    found = place.entries(WAY_KEYS, LATER_WAY_KEYS, MEANT)
    needs, takes = names_in(place, found)
    way = Way(**purchase_fields(found, needs, takes), **share_fields(found, "reliability"))
    return Listed(name, variable, way, place, needs, takes)


def listed_component(name: str, place: Located) -> Listed:
    """Read one component."""
    found = place.entries(COMPONENT_KEYS, LATER_COMPONENT_KEYS, MEANT)
    needs, takes = names_in(place, found)
    component = Component(**purchase_fields(found, needs, takes), **flag_fields(found, "always"))
    return Listed(name, "", component, place, needs, takes)


def names_in(
    place: Located, found: Mapping[str, Located]
) -> tuple[dict[str, Located], dict[str, Located]]:
    """Return the components and burdens that are named, to be looked up; no price is a fault."""
    if not any(key in found for key in PRICE_KEYS):
        mend = "Write 'per_unit: 0' if it costs nothing, else any of per_unit, setup, batch, needs."
        place.fault("has no price.", mend)
    needs = found["needs"].names() if "needs" in found else {}
    takes = found["takes"].named() if "takes" in found else {}
    return needs, takes


def purchase_fields(
    found: Mapping[str, Located], needs: Mapping[str, Located], takes: Mapping[str, Located]
) -> dict[str, Any]:
    """Return the fields of ``Purchase``; what cannot be read keeps its default, with a fault."""
    read: dict[str, Any] = {
        "setup": read_price(found["setup"]) if "setup" in found else None,
        "per_unit": read_price(found["per_unit"]) if "per_unit" in found else None,
        "batch": read_batch(found["batch"]) if "batch" in found else None,
        "label": found["label"].line() if "label" in found else None,
        "needs": tuple(needs),
        "takes": read_amounts(takes),
        "texts": read_texts(found),
        **flag_fields(found, "care"),
        **share_fields(found, "yields"),
    }
    return {key: value for key, value in read.items() if value is not None}


def read_amounts(takes: Mapping[str, Located]) -> dict[str, Fraction]:
    """Return how much of each burden one unit bears."""
    amounts = {
        name: place.number(least=0, most=MOST_TAKEN, places=TAKES_PLACES)
        for name, place in takes.items()
    }
    return {name: amount for name, amount in amounts.items() if amount is not None}


def flag_fields(found: Mapping[str, Located], key: str) -> dict[str, Any]:
    """Return a field that is a yes or a no, if it is there."""
    flag = found[key].flag() if key in found else None
    return {} if flag is None else {key: flag}


def share_fields(found: Mapping[str, Located], key: str) -> dict[str, Any]:
    """Return a field that is a share above 0 and up to 1, if it is there."""
    share = found[key].number(above=0, most=1) if key in found else None
    return {} if share is None else {key: share}


def read_price(place: Located) -> Fraction | None:
    """Return a price: 0 or more, at most four decimals."""
    return place.number(least=0, places=PRICE_PLACES)


def read_batch(place: Located) -> Batch | None:
    """Return ``{holds: 38, price: 760}``."""
    found = place.entries(("holds", "price"), meant=MEANT)
    missing = [key for key in ("holds", "price") if key not in found]
    if missing:
        place.fault(f"lacks '{missing[0]}'.", "Write it like {holds: 38, price: 760}.")
        return None
    holds, price = found["holds"].integer(least=1), read_price(found["price"])
    return None if holds is None or price is None else Batch(holds=holds, price=price)


def read_texts(found: Mapping[str, Located]) -> dict[str, str]:
    """Return the texts that are kept for the reports."""
    return {
        key: text
        for key in TEXTS
        if key in found and (text := read_answers(found[key])) is not None
    }


def read_answers(place: Located) -> str | None:
    """Return a text; a list of texts, such as possible answers, is joined by semicolons."""
    if place.is_list:
        return "; ".join(filter(None, (item.text() for item in place.items())))
    return place.text()


def read_burdens(place: Located) -> dict[str, Burden]:
    """Read ``{minutes: {limit: 30, price: 1.10}, blood_ml: {limit: 10, care: yes}}``."""
    burdens = {}
    for name, entry in place.named().items():
        found = entry.entries(("label", "limit", "price", "care"))
        read: dict[str, Any] = {
            "label": found["label"].line() if "label" in found else None,
            "limit": found["limit"].number(least=0, most=MOST_TAKEN, places=TAKES_PLACES)
            if "limit" in found
            else None,
            "price": read_price(found["price"]) if "price" in found else None,
            **flag_fields(found, "care"),
        }
        burdens[name] = Burden(**{key: value for key, value in read.items() if value is not None})
    return burdens


# ------------------------------------------------------------------------------- all lists together


def combined(
    every: Iterable[Listed], burdens: Mapping[str, Burden], *, complete: bool = True
) -> PriceList:
    """Return one price list; what stands twice, is unknown or needs itself is a fault.

    Parameters
    ----------
    every
        From all files, in the order in which they were read.
    burdens
        The burdens that the study declares.
    complete
        Whether every file could be read; if not, a component may be missing for that reason.
    """
    first: dict[tuple[str, str], Listed] = {}
    for each in every:
        known = first.setdefault((each.variable, each.name), each)
        if known is not each:
            what = "way" if each.variable else "component"
            place = known.place
            each.place.fault(
                f"gives the same {what} again, after {place.source.file}:{place.node.spot}.",
                "Keep one of the two.",
            )
    components = {each.name: each for each in first.values() if not each.variable}
    for each in first.values():
        if complete:
            look_up(each.needs, components, "component")
        look_up(each.takes, burdens, "burden")
    refuse_circles(components)
    return PriceList(
        ways=ways_by_variable(first.values()),
        components={
            name: each.purchase
            for name, each in components.items()
            if isinstance(each.purchase, Component)
        },
    )


def look_up(names: Mapping[str, Located], known: Mapping[str, object], kind: str) -> None:
    """Say which of the names are not known."""
    for name, place in names.items():
        if name not in known:
            place.fault(
                f"names the {kind} '{shortened(name)}', which is not there.",
                place.source.nearest(name, known),
            )


def refuse_circles(components: Mapping[str, Listed]) -> None:
    """Say which components need each other in a circle, if any."""
    for circle in circles({name: tuple(each.needs) for name, each in components.items()}):
        place = components[circle[0]].place
        shown = spelt_out(list(reversed(circle)), " needs ")
        place.fault(f"needs itself: {shown}.", "Take one of these needs out.")


def ways_by_variable(every: Iterable[Listed]) -> dict[str, dict[str, Way]]:
    """Return the ways of each variable, by name."""
    ways: dict[str, dict[str, Way]] = {}
    for each in every:
        if isinstance(each.purchase, Way):
            ways.setdefault(each.variable, {})[each.name] = each.purchase
    return ways

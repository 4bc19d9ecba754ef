"""The study file as a whole: its keys, its price lists, and the ``Study`` that they make."""

import gc
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from costs.faults import Faults
from costs.files import NamedFile, read_file, yaml_tree
from costs.located import Located
from costs.prices import Burden, PriceList
from costs.reading import (
    Listed,
    PriceFile,
    combined,
    listed_component,
    read_burdens,
    read_price_file,
)
from costs.tables import MEANT
from planner.reading.settings import (
    SIZE_KEYS,
    SIZES,
    TARGETS,
    read_budget,
    read_design_effect,
    read_frame_size,
    read_in_units,
    read_routes,
    read_size,
    read_terms,
    read_text,
    read_tolerance,
    read_waves,
)
from planner.reading.variables import (
    DrawnVariable,
    read_hidden_causes,
    read_strength,
    read_variables,
)
from planner.reading.whole import (
    check_arrows,
    check_countable,
    check_measurable,
    check_priced,
    check_strengths,
    check_target,
    check_timing,
    check_units,
    read_effect,
    read_selected,
)
from planner.routes import ROUTES
from planner.study import HiddenCause, PriceSource, Range, Study

__all__ = ["read_study"]

KEYS = (
    "title",
    "unit",
    "currency",
    "effect",
    "variables",
    "hidden_common_causes",
    "components",
    "burdens",
    "size",
    "fieldwork",
    "tolerance",
    "budget",
    "overhead",
    "contingency",
    "default_strength",
    "routes",
    "selected_by",
    "waves",
    "prices",
)
MOST_COMPONENTS = 5_000
FIELDWORK_KEYS = ("usable", "design_effect", "frame_size", "clusters")
LATER_KEYS = ("effects", "doubts", "rivals", "routes_wanted", "spare", "subgroup")
WANTED = {
    "effect": "Write 'effect: {treatment: …, outcome: …}'.",
    "variables": "List the variables, each with what causes it and how it is measured.",
    "size": SIZES,
}


def read_study(path: str | Path, *, prices: Sequence[str | Path] | None = None) -> Study:
    """Return the study in the file at ``path``.

    Parameters
    ----------
    path
        A YAML study file.
    prices
        Price-list files to read in place of those that the study names; None reads those.

    Raises
    ------
    FaultyInput
        With every fault of every file, if there is any.
    """
    faults = Faults()
    with collector_paused():
        study = read_all(Path(path), None if prices is None else list(map(Path, prices)), faults)
    faults.raise_any()
    assert study is not None, "a study that could not be made has a fault"
    return study


def read_all(path: Path, prices: Sequence[Path] | None, faults: Faults) -> Study | None:
    """Return the study; None where it cannot be made, which is then among the faults."""
    file = read_file(path, faults)
    tree = yaml_tree(file, faults) if file else None
    if file is None or tree is None:
        return None
    found = entries_of(tree)
    named = named_lists(file.path, found) if prices is None else prices
    lists = [each for name in named if (each := read_price_file(name, faults)) is not None]
    whole = len(lists) == len(named) and not any(faults.spoil(str(each)) for each in named)
    parts = parts_of(found, lists, whole=whole)
    study = study_of(file, found, lists, parts)
    if study is not None and not faults:
        check_countable(study, found["size"], parts.listed)
        if study.size.is_target:
            check_target(study, next(found[key] for key in TARGETS if key in found))
    return study


@contextmanager
def collector_paused() -> Iterator[None]:
    """Pause the garbage collector: a file becomes very many small objects, and none is garbage.

    It takes more than half of the time of reading a large study.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def entries_of(tree: Located) -> dict[str, Located]:
    """Return the keys of a study file, and those of its fieldwork and size beside them."""
    found = tree.entries(KEYS, LATER_KEYS, MEANT)
    for key, mend in WANTED.items():
        if key not in found and tree.is_mapping:
            tree.below(key).fault("is missing.", mend)
    for key, keys in (("fieldwork", FIELDWORK_KEYS), ("size", SIZE_KEYS)):
        if key in found:
            found |= found[key].entries(keys)
    return found


def named_lists(study: Path, found: Mapping[str, Located]) -> list[Path]:
    """Return the price lists that the study names, seen from its own folder."""
    return [study.parent / name for name in found["prices"].names()] if "prices" in found else []


@dataclass(frozen=True, kw_only=True, slots=True)
class Parts:
    """What the diagram and the price lists hold, before it is a study."""

    waves: tuple[str, ...]
    default_strength: Range | None
    drawn: Mapping[str, DrawnVariable]
    """Empty where the variables could not be read."""
    hidden_causes: tuple[HiddenCause, ...]
    burdens: Mapping[str, Burden]
    listed: tuple[Listed, ...]
    """Everything that can be bought, from the study file and then from the price lists."""
    whole: bool
    """Every price list could be read, so that what is not listed is really missing."""


def parts_of(found: Mapping[str, Located], lists: Sequence[PriceFile], *, whole: bool) -> Parts:
    """Read the diagram and everything that can be bought."""
    waves = read_waves(found)
    numbers = {wave: number for number, wave in enumerate(waves, 1)}
    drawn = read_variables(found["variables"], numbers) if "variables" in found else {}
    own = [way for each in drawn.values() for way in each.listed]
    own += read_components(found["components"]) if "components" in found else []
    others = [each for prices in lists for each in prices.listed]
    hidden: tuple[HiddenCause, ...] = ()
    if drawn:
        check_priced(
            {each.variable: each.place for each in reversed(others) if each.variable}, drawn
        )
        if "hidden_common_causes" in found:
            hidden = read_hidden_causes(found["hidden_common_causes"], drawn)
    return Parts(
        waves=waves,
        default_strength=read_strength(found["default_strength"])
        if "default_strength" in found
        else None,
        drawn=drawn,
        hidden_causes=hidden,
        burdens=read_burdens(found["burdens"]) if "burdens" in found else {},
        listed=(*own, *others),
        whole=whole,
    )


def read_components(place: Located) -> list[Listed]:
    """Return the components of the study file."""
    named = place.named()
    if len(named) > MOST_COMPONENTS:
        wrong = f"names {len(named):,} components; at most {MOST_COMPONENTS:,} are read."
        place.fault(wrong, "Leave out those that nothing needs.")
        return []
    return [listed_component(name, each) for name, each in named.items()]


def study_of(
    file: NamedFile, found: Mapping[str, Located], lists: Sequence[PriceFile], parts: Parts
) -> Study | None:
    """Return the study; None where a part that everything hangs on is at fault."""
    drawn = parts.drawn
    prices = prices_of(parts)
    if parts.whole:
        check_measurable(drawn, prices)
    order = check_arrows(drawn)
    unchecked = 0
    if order is not None:
        check_timing(drawn, order, parts.waves)
        unchecked = check_strengths(drawn, parts.hidden_causes, parts.default_strength, order)
    effect = None
    if "effect" in found and drawn:
        effect = read_effect(found["effect"], drawn, prices.ways if parts.whole else drawn)
    in_units = read_in_units(found)
    if effect is not None and in_units:
        check_units(found["in"], effect, drawn)
    size = read_size(found, in_units=in_units)
    terms = read_terms(found, parts.burdens, size)
    settings = read_settings(found, lists, drawn)
    title, unit = read_text(found, "title"), read_text(found, "unit")
    if effect is None or size is None:
        return None
    return Study(
        title=title or f"What is the effect of {effect.treatment} on {effect.outcome}?",
        unit=unit or "unit",
        effects=(effect,),
        variables={name: each.variable for name, each in drawn.items()},
        hidden_causes=parts.hidden_causes,
        prices=prices,
        size=size,
        terms=terms,
        default_strength=parts.default_strength,
        waves=parts.waves,
        unchecked_strengths=unchecked,
        path=str(file.path),
        digest=file.digest,
        price_sources=tuple(source_of(each) for each in lists),
        **settings,
    )


def read_settings(
    found: Mapping[str, Located],
    lists: Sequence[PriceFile],
    drawn: Mapping[str, DrawnVariable],
) -> dict[str, Any]:
    """Return the fields of a study that stand in keys of their own."""
    selected = found["selected_by"] if "selected_by" in found and drawn else None
    return {
        "currency": read_currency(found, lists),
        "selected_by": read_selected(selected, drawn) if selected else (),
        "budget": read_budget(found),
        "frame_size": read_frame_size(found),
        "tolerance": read_tolerance(found),
        "design_effect": read_design_effect(found, tuple(ROUTES)),
        "routes": read_routes(found, tuple(ROUTES)),
    }


def source_of(prices: PriceFile) -> PriceSource:
    """Return what the study remembers of a price-list file."""
    file = prices.file
    return PriceSource(
        path=str(file.path),
        digest=file.digest,
        valid_until=prices.valid_until,
        unread=prices.unread,
    )


def prices_of(parts: Parts) -> PriceList:
    """Return all that can be bought, ways in the order of the study's variables."""
    prices = combined(parts.listed, parts.burdens, complete=parts.whole)
    ordered = {name: prices.ways[name] for name in parts.drawn if name in prices.ways}
    return PriceList(ways=ordered, components=prices.components)


def read_currency(found: Mapping[str, Located], lists: Sequence[PriceFile]) -> str:
    """Return the currency of the study, or of its price lists; they must agree."""
    currency = read_text(found, "currency")
    for each in lists:
        other = read_text({"currency": each.currency}, "currency") if each.currency else ""
        currency = currency or other
        if each.currency and other and other != currency:
            each.currency.fault(
                f"is '{other}', but the study counts in '{currency}'.",
                "Convert the prices, or correct the currency.",
            )
    return currency

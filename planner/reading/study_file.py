"""The study file as a whole: its keys, its price lists, and the ``Study`` that they make."""

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from costs.faults import Faults
from costs.files import NamedFile, read_file, yaml_tree
from costs.located import Located
from costs.prices import Burden, PriceList
from costs.reading import PriceFile, combined, listed_component, read_burdens, read_price_file
from costs.tables import MEANT
from planner.reading.settings import (
    read_budget,
    read_design_effect,
    read_frame_size,
    read_routes,
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
    check_measurable,
    check_priced,
    check_strengths,
    check_timing,
    read_effect,
    read_selected,
)
from planner.routes import ROUTES
from planner.study import HiddenCause, PriceSource, Study

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
LATER_KEYS = ("effects", "doubts", "rivals", "routes_wanted", "spare", "subgroup")
WANTED = {
    "effect": "Write 'effect: {treatment: …, outcome: …}'.",
    "variables": "List the variables of the diagram, each with what causes it and how it is measured.",
    "size": "Write 'size: {records: 400}', the number of complete records.",
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
    file = read_file(Path(path), faults)
    tree = yaml_tree(file, faults) if file else None
    study = None
    if file and tree:
        found = entries_of(tree)
        named = named_lists(file.path, found) if prices is None else [Path(each) for each in prices]
        lists = [each for name in named if (each := read_price_file(name, faults)) is not None]
        study = study_of(file, found, lists)
    faults.raise_any()
    assert study is not None, "a study that could not be made has a fault"
    return study


def entries_of(tree: Located) -> dict[str, Located]:
    """Return the keys of a study file; those that no study can do without are there."""
    found = tree.entries(KEYS, LATER_KEYS, MEANT)
    for key, mend in WANTED.items():
        if key not in found and tree.is_mapping:
            tree.below(key).fault("is missing.", mend)
    return found


def named_lists(study: Path, found: Mapping[str, Located]) -> list[Path]:
    """Return the price lists that the study names, seen from its own folder."""
    return [study.parent / name for name in found["prices"].names()] if "prices" in found else []


def study_of(
    file: NamedFile, found: Mapping[str, Located], lists: Sequence[PriceFile]
) -> Study | None:
    """Return the study; None where a part that everything hangs on is at fault."""
    waves = read_waves(found)
    default = read_strength(found["default_strength"]) if "default_strength" in found else None
    drawn = read_variables(found["variables"], waves) if "variables" in found else {}
    hidden: tuple[HiddenCause, ...] = ()
    if "hidden_common_causes" in found:
        hidden = read_hidden_causes(found["hidden_common_causes"], drawn)
    burdens = read_burdens(found["burdens"]) if "burdens" in found else {}
    prices = read_prices(found, drawn, lists, burdens)
    check_timing(drawn)
    check_measurable(drawn, prices)
    order = check_arrows(drawn)
    if order is not None:
        check_strengths(drawn, hidden, default, order)
    effect = read_effect(found["effect"], drawn, prices) if "effect" in found else None
    terms = read_terms(found, burdens)
    settings: dict[str, Any] = {
        "currency": read_currency(found, lists),
        "selected_by": read_selected(found["selected_by"], drawn) if "selected_by" in found else (),
        "budget": read_budget(found),
        "frame_size": read_frame_size(found),
        "tolerance": read_tolerance(found),
        "design_effect": read_design_effect(found, tuple(ROUTES)),
        "routes": read_routes(found, tuple(ROUTES)),
    }
    title, unit = read_text(found, "title"), read_text(found, "unit")
    if effect is None or terms is None:
        return None
    return Study(
        title=title or f"What is the effect of {effect.treatment} on {effect.outcome}?",
        unit=unit or "unit",
        effects=(effect,),
        variables={name: each.variable for name, each in drawn.items()},
        hidden_causes=hidden,
        prices=prices,
        terms=terms,
        default_strength=default,
        waves=waves,
        path=str(file.path),
        digest=file.digest,
        price_sources=tuple(source_of(each) for each in lists),
        **settings,
    )


def source_of(prices: PriceFile) -> PriceSource:
    """Return what the study remembers of a price-list file."""
    file = prices.file
    return PriceSource(path=str(file.path), digest=file.digest, valid_until=prices.valid_until)


def read_prices(
    found: Mapping[str, Located],
    drawn: Mapping[str, DrawnVariable],
    lists: Sequence[PriceFile],
    burdens: Mapping[str, Burden],
) -> PriceList:
    """Return all that can be bought, from the study file and then from the price lists."""
    components = found["components"].named() if "components" in found else {}
    own = [way for each in drawn.values() for way in each.listed]
    own += [listed_component(name, place) for name, place in components.items()]
    others = [each for prices in lists for each in prices.listed]
    check_priced({each.variable: each.place for each in reversed(others) if each.variable}, drawn)
    prices = combined([*own, *others], burdens)
    # In the order of the study, so that the order of a price list changes no answer.
    ordered = {name: prices.ways[name] for name in drawn if name in prices.ways}
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

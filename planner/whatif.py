"""What-if options as functions from a study to another study."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

from costs.bill import needed_by
from costs.faults import Fault, FaultyInput, Spot
from costs.located import nearest, shortened
from costs.prices import MOST_RECORDS, Component, PriceList, Way
from planner.study import Study

__all__ = ["held", "with_records", "with_routes", "without"]


def with_records(study: Study, records: int) -> Study:
    """Return the study on so many complete records, whatever sized it before."""
    if not 1 <= records <= MOST_RECORDS:
        raise refusal("--records", f"is {records:,}.", f"Give a number from 1 to {MOST_RECORDS:,}.")
    size = replace(
        study.size, records=records, half_width=None, detect=None, implied=False, spend=None
    )
    terms = replace(study.terms, records=records)
    return changed(replace(study, size=size, terms=terms), f"--records {records}")


def with_routes(study: Study, routes: Sequence[str]) -> Study:
    """Return the study with these routes allowed only, all of which it must allow."""
    for route in routes:
        if route not in study.routes:
            wrong = f"'{shortened(route)}' is no route that the study allows."
            raise refusal("--route", wrong, nearest(route, study.routes))
    kept = tuple(route for route in study.routes if route in routes)
    return changed(replace(study, routes=kept), f"--route {' --route '.join(kept)}")


def without(study: Study, name: str) -> Study:
    """Return the study in which something cannot be had after all.

    Parameters
    ----------
    name
        A variable, which can then not be measured; one of its ways, as ``VARIABLE.WAY``; or a
        component, which takes along whatever needs it.
    """
    prices = study.prices
    ways = list(ways_named(study, name))
    found = (name in prices.ways) + (name in prices.components) + len(ways)
    if found > 1:
        raise refusal(
            "--without", f"'{shortened(name)}' is more than one thing.", "Rename one of them."
        )
    if name in prices.ways:
        left = replace(prices, ways={v: named for v, named in prices.ways.items() if v != name})
    elif name in prices.components:
        left = without_component(prices, name)
    elif ways:
        left = without_way(prices, *ways[0])
    else:
        raise unknown("--without", name, study)
    return changed(still_possible(replace(study, prices=left), name), f"--without {name}")


def without_component(prices: PriceList, name: str) -> PriceList:
    """Return the price list without a component and whatever needs it."""

    def does(purchase: Way | Component) -> bool:
        return name not in needed_by(purchase.needs, prices)

    always = [
        each
        for each, component in prices.components.items()
        if component.always and (each == name or not does(component))
    ]
    if always:
        mend = "Take 'always' out of the study first, if it can do without."
        raise refusal("--without", f"'{always[0]}' is always bought.", mend)
    ways = {
        variable: {way: purchase for way, purchase in named.items() if does(purchase)}
        for variable, named in prices.ways.items()
    }
    components = {
        each: component
        for each, component in prices.components.items()
        if each != name and does(component)
    }
    return PriceList(ways=not_empty(ways), components=components)


def without_way(prices: PriceList, variable: str, way: str) -> PriceList:
    """Return the price list without one way."""
    named = {name: purchase for name, purchase in prices.ways[variable].items() if name != way}
    return replace(prices, ways=not_empty({**prices.ways, variable: named}))


def not_empty(ways: Mapping[str, Mapping[str, Way]]) -> dict[str, Mapping[str, Way]]:
    """Return the variables that still have a way."""
    return {variable: named for variable, named in ways.items() if named}


def still_possible(study: Study, name: str) -> Study:
    """Return the study if treatment and outcome can still be measured."""
    for effect in study.effects:
        for role, variable in (("treatment", effect.treatment), ("outcome", effect.outcome)):
            if variable not in study.prices.ways:
                wrong = f"without '{name}' the {role} '{variable}' cannot be measured."
                raise refusal("--without", wrong, "No study can do without it.")
    return study


def held(study: Study, name: str) -> Study:
    """Return the study in which one way, as ``VARIABLE.WAY``, is already in hand.

    It costs nothing, needs nothing and burdens nobody; what it yields and how reliable it is stay.
    """
    ways = list(ways_named(study, name))
    if len(ways) > 1:
        raise refusal("--held", f"'{shortened(name)}' is more than one way.", "Rename one of them.")
    if not ways:
        raise unknown("--held", name, study)
    variable, way = ways[0]
    old = study.prices.ways[variable][way]
    free = Way(
        label=old.label,
        yields=old.yields,
        care=old.care,
        texts=old.texts,
        reliability=old.reliability,
    )
    named = {**study.prices.ways[variable], way: free}
    prices = replace(study.prices, ways={**study.prices.ways, variable: named})
    return changed(replace(study, prices=prices), f"--held {name}")


def ways_named(study: Study, name: str) -> Iterator[tuple[str, str]]:
    """Return the ways that ``VARIABLE.WAY`` names; both names may hold points themselves."""
    for place, letter in enumerate(name):
        variable, way = name[:place], name[place + 1 :]
        if letter == "." and way in study.prices.ways.get(variable, {}):
            yield variable, way


def changed(study: Study, option: str) -> Study:
    """Return the study with a note of what was asked for on the command line."""
    return replace(study, changes=(*study.changes, option))


def unknown(option: str, name: str, study: Study) -> FaultyInput:
    """Return the refusal of a name that is not there."""
    ways = [f"{v}.{way}" for v, named in study.prices.ways.items() for way in named]
    known = ways if option == "--held" else [*study.prices.ways, *study.prices.components, *ways]
    gone = ", or not any more" if study.changes else ""
    wrong = f"'{shortened(name)}' is nothing that can be bought{gone}."
    return refusal(option, wrong, nearest(name, known))


def refusal(option: str, wrong: str, mend: str) -> FaultyInput:
    """Return the refusal of an option."""
    return FaultyInput(
        [Fault(file="command line", spot=Spot(1), key=option, wrong=wrong, mend=mend)]
    )

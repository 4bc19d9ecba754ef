"""The variables of a study file: their arrows, strengths, timing, and ways of measuring."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

from costs.located import Located, shortened
from costs.prices import STANDARD, TEXTS
from costs.reading import LATER_WAY_KEYS, PRICE_KEYS, Listed, listed_way, read_texts
from costs.tables import MEANT
from planner.strengths import WORDS
from planner.study import HIDDEN, HiddenCause, Range, Variable

__all__ = ["DrawnVariable", "read_hidden_causes", "read_strength", "read_variables"]

MOST_VARIABLES = 20_000
MOST_WAYS = 1_000
"""Ways of one variable."""
LARGEST_STRENGTH = 10
"""In standard deviations; coefficients above 1 occur among correlated causes, not above this."""
OWN_WAY_KEYS = (*PRICE_KEYS, "takes", "reliability", "yields")
"""Keys of a way that a variable may carry itself: it then has one way, ``standard``."""
KEYS = (
    "label",
    "caused_by",
    "when",
    "measurable",
    "ways",
    "sd",
    "share",
    "care",
    *OWN_WAY_KEYS,
    *TEXTS,
)


@dataclass(frozen=True, slots=True)
class DrawnVariable:
    """A variable as it stands in the file."""

    variable: Variable
    place: Located
    cause_places: Mapping[str, Located]
    when_place: Located | None
    listed: tuple[Listed, ...]
    """Its ways, as far as the study file gives them."""
    measurable: bool | None
    """What ``measurable:`` says; None where it is not there."""
    has_spread: bool
    """Its SD or share is given, rightly or not."""


def read_variables(place: Located, waves: Mapping[str, int]) -> dict[str, DrawnVariable]:
    """Return every variable by name, in the order of the file."""
    named = place.named()
    if not named:
        place.fault("names no variable.", "List the variables of the diagram.")
    if len(named) > MOST_VARIABLES:
        wrong = f"names {len(named):,} variables; at most {MOST_VARIABLES:,} are read."
        place.fault(wrong, "Leave out what is neither a cause nor an effect of what you ask about.")
        return {}
    return {name: read_variable(name, each, waves) for name, each in named.items()}


def read_variable(name: str, place: Located, waves: Mapping[str, int]) -> DrawnVariable:
    """Return one variable; a variable that carries a way's keys has that one way."""
    found = place.entries(KEYS, LATER_WAY_KEYS, MEANT)
    if name.startswith(HIDDEN):
        place.fault("has a name that is kept for hidden common causes.", "Choose another name.")
    causes = read_causes(found["caused_by"]) if "caused_by" in found else {}
    variable = Variable(
        name=name,
        label=(found["label"].line() or "") if "label" in found else "",
        causes={cause: strength for cause, (_, strength) in causes.items()},
        when=read_when(found["when"], waves) if "when" in found else None,
        sd=read_spread(found, "sd"),
        share=read_spread(found, "share"),
        care=bool(found["care"].flag()) if "care" in found else False,
        texts=read_texts(found),
    )
    return DrawnVariable(
        variable=variable,
        place=place,
        cause_places={cause: arrow for cause, (arrow, _) in causes.items()},
        when_place=found.get("when"),
        listed=read_ways(name, place, found),
        measurable=found["measurable"].flag() if "measurable" in found else None,
        has_spread="sd" in found or "share" in found,
    )


def read_ways(name: str, place: Located, found: Mapping[str, Located]) -> tuple[Listed, ...]:
    """Return the ways that stand with the variable itself."""
    own = [key for key in OWN_WAY_KEYS if key in found]
    standard = (listed_way(name, STANDARD, place.only(own)),) if own else ()
    if "ways" not in found:
        return standard
    if own:
        found[own[0]].fault("stands beside 'ways'.", "Move it into one of the ways.")
    ways = found["ways"].named()
    if len(ways) > MOST_WAYS:
        wrong = f"names {len(ways):,} ways; at most {MOST_WAYS:,} are read."
        found["ways"].fault(wrong, "Leave out those that nobody would take.")
    first = list(ways.items())[:MOST_WAYS]
    return tuple(listed_way(name, way, each) for way, each in first)


def read_spread(found: Mapping[str, Located], key: str) -> float | None:
    """Return a standard deviation, or the share of yes; one excludes the other."""
    if key not in found:
        return None
    if key == "share" and "sd" in found:
        found[key].fault("stands beside 'sd': a share gives its own.", "Keep one of the two.")
    value = found[key].number(above=0, below=1 if key == "share" else None)
    return None if value is None else float(value)


def read_when(place: Located, waves: Mapping[str, int]) -> Fraction | None:
    """Return a time: a number, or the place of a wave in the list of waves, counted from 1."""
    word = place.name()
    if word is None:
        return None
    if word in waves:
        return Fraction(waves[word])
    if not waves and word[0].isalpha():
        mend = "Write 'waves: [first, second]' at the top of the study, or a number here."
        place.fault(f"names the wave '{shortened(word)}', but there are no waves.", mend)
        return None
    if word[0].isalpha():
        place.fault(
            f"names the wave '{shortened(word)}', which is not there.",
            place.source.nearest(word, waves),
        )
        return None
    return place.number()


# ----------------------------------------------------------------------------- arrows and strengths


def read_causes(place: Located) -> dict[str, tuple[Located, Range | None]]:
    """Return each cause with its place and strength; in a plain list strengths are unknown."""
    if not place.is_mapping:
        return {cause: (each, None) for cause, each in place.names().items()}
    return {
        cause: (each, None if each.is_empty else read_strength(each))
        for cause, each in place.named().items()
    }


def read_strength(place: Located) -> Range | None:
    """Return a strength: a number, a word, ``[low, high]`` or ``[low, likely, high]``."""
    if place.is_list and len(place.items()) not in {2, 3}:
        wrong = f"is a list of {len(place.items())}."
        place.fault(wrong, "Write a range as [low, high] or [low, likely, high].")
        return None
    values = [read_coefficient(each) for each in place.items()]
    known = [value for value in values if value is not None]
    if len(known) < len(values) or not values:
        return None
    if known != sorted(known):
        place.fault("is a range that does not run upwards.", "Write the lowest value first.")
        return None
    likely = known[1] if len(known) == 3 else (known[0] + known[-1]) / 2
    return Range(low=known[0], likely=likely, high=known[-1])


def read_coefficient(place: Located) -> float | None:
    """Return a path coefficient, as a number or a word with or without a minus sign."""
    word = place.name()
    if word is None:
        return None
    bare = word.removeprefix("-").lstrip()
    if bare in WORDS:
        return -WORDS[bare] if word.startswith("-") else WORDS[bare]
    if bare[:1].isalpha():
        place.fault(f"is {place.shown}, which is no strength.", place.source.nearest(bare, WORDS))
        return None
    value = place.number(least=-LARGEST_STRENGTH, most=LARGEST_STRENGTH)
    return None if value is None else float(value)


def read_hidden_causes(place: Located, drawn: Mapping[str, object]) -> tuple[HiddenCause, ...]:
    """Return the unmeasurable common causes that have no name of their own.

    Each is given one, which no variable and no other cause has.
    """
    causes: dict[frozenset[str], HiddenCause] = {}
    names: set[str] = set()
    for each in place.items():
        cause = read_hidden_cause(each, drawn)
        if cause is None:
            continue
        if frozenset(cause.of) in causes:
            each.fault(f"gives a {cause.name} again.", "Keep one of the two.")
        # Names with 'and' in them can make two causes sound alike.
        alike = sum(name == cause.name or name.startswith(f"{cause.name} (") for name in names)
        name = f"{cause.name} ({alike + 1})" if alike else cause.name
        names.add(name)
        causes.setdefault(frozenset(cause.of), replace(cause, name=name))
    return tuple(causes.values())


def read_hidden_cause(place: Located, drawn: Mapping[str, object]) -> HiddenCause | None:
    """Return ``[a, b]`` or ``{of: [a, b], strength: 0.1}``."""
    found = place.entries(("of", "strength")) if place.is_mapping else {"of": place}
    names = found["of"].names() if "of" in found and found["of"].is_list else {}
    unknown = [name for name in names if name not in drawn]
    for name in unknown:
        names[name].fault(
            f"names the variable '{shortened(name)}', which is not there.",
            place.source.nearest(name, drawn),
        )
    if len(names) != 2:
        place.fault("does not name two variables.", "Write it like [first, second].")
    strength = read_strength(found["strength"]) if "strength" in found else None
    if strength is not None and max(abs(strength.low), abs(strength.high)) >= 1:
        found["strength"].fault("is no correlation.", "Write a number between -1 and 1.")
    if unknown or len(names) != 2:
        return None
    first, second = names
    return HiddenCause(of=(first, second), name=f"{HIDDEN}{first} and {second}", strength=strength)

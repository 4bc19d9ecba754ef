"""The keys of a study file that stand alone: size, fieldwork, tolerance, money, waves, routes."""

from collections.abc import Collection, Mapping, Sequence
from fractions import Fraction
from typing import Any

from costs.located import Located, Scalar
from costs.prices import MOST_RECORDS, Burden, Terms
from costs.reading import PRICE_PLACES
from planner.study import ClusterDesign, Size, Tolerance

__all__ = [
    "SIZES",
    "SIZE_KEYS",
    "TARGETS",
    "read_budget",
    "read_design_effect",
    "read_frame_size",
    "read_in_units",
    "read_routes",
    "read_size",
    "read_terms",
    "read_text",
    "read_tolerance",
    "read_waves",
]

LARGEST_SURCHARGE = 10
"""A share: 10 is ten times the direct costs, so a larger one was meant in per cent."""
TARGETS = ("records", "half_width", "detect", "spend")
"""Just one of them sizes a study."""
SIZE_KEYS = (*TARGETS, "power", "confidence", "in")
SIZES = (
    "Write 'size: {records: 400}', or {half_width: 0.05}, {detect: 0.12, power: 0.8} or"
    " {spend: 60000}."
)
USUAL_CONFIDENCE = Fraction(str(Size().confidence))
MOST_TOLERATED = {"least_reliability": 1, "bias": None, "first_stage_F": None}
"""What may stand in ``tolerance``, and how much it can be."""

Found = Mapping[str, Located]
"""The keys of a study file, those of ``fieldwork`` and ``size`` among them."""


def read_text(found: Found, key: str) -> str:
    """Return a text on one line, empty where there is none."""
    return (found[key].line() or "") if key in found else ""


def read_size(found: Found, *, in_units: bool) -> Size | None:
    """Return how large the study is to be; None if the key that says so is missing or at fault."""
    targets = [key for key in found if key in TARGETS]
    check_targets(found, targets)
    wanted = [read_target(key, found[key]) for key in targets]
    chances = read_chances(found)
    if len(wanted) != 1 or wanted[0] is None:
        return None
    return Size(**wanted[0], **chances, in_units=in_units)


def check_targets(found: Found, targets: Sequence[str]) -> None:
    """Say whether there is no key that sizes the study, or more than one, or power without use."""
    place = found.get("size")
    if place is not None and not targets and (place.is_mapping or place.is_empty):
        place.fault("does not say how large the study is to be.", SIZES)
    for key in targets[1:]:
        wrong = f"stands beside '{targets[0]}', which sizes the study already."
        found[key].fault(wrong, "Keep one of the two.")
    if targets and "power" in found and "detect" not in targets:
        mend = f"Leave it out, or size the study by an effect to detect in place of '{targets[0]}'."
        found["power"].fault("goes with 'detect' only.", mend)


def read_target(key: str, place: Located) -> dict[str, Any] | None:
    """Return the field of a size that one of its keys fills; None if that is at fault."""
    if key == "detect" and is_word(place):
        return {"implied": True} if place.choice(("implied",)) else None
    value: Fraction | float | None
    if key == "records":
        value = place.integer(least=1, most=MOST_RECORDS)
    elif key == "spend":
        value = place.number(least=0, places=PRICE_PLACES)
    else:
        number = place.number(above=0)
        value = None if number is None else float(number)
    return None if value is None else {key: value}


def is_word(place: Located) -> bool:
    """Say whether a word is written here, where a number may be."""
    return isinstance(place.node, Scalar) and place.node.text.strip()[:1].isalpha()


def read_chances(found: Found) -> dict[str, Any]:
    """Return power and confidence, as far as they are given."""
    given: dict[str, Fraction] = {}
    for key in ("power", "confidence"):
        share = found[key].number(above=0, below=1) if key in found else None
        if share is not None:
            given[key] = share
    confidence = given.get("confidence", USUAL_CONFIDENCE)
    # A test decides for the right side that often even where the data say nothing.
    chance = (1 - confidence) / 2
    if given.get("power", 1) <= chance:
        found["power"].fault(
            f"is {found['power'].shown}, but chance alone detects with {float(chance):g} at a"
            f" confidence of {float(confidence):g}.",
            f"Write a number that is above {float(chance):g}.",
        )
    return {key: float(share) for key, share in given.items()}


def read_in_units(found: Found) -> bool:
    """Say whether effects are in natural units."""
    return "in" in found and found["in"].choice(("units",)) is not None


def read_terms(found: Found, burdens: Mapping[str, Burden], size: Size | None) -> Terms:
    """Return the number of records, one at a target, and what is lost and added."""
    return Terms(
        records=(size and size.records) or 1,
        usable=read_usable(found),
        burdens=burdens,
        overhead=read_surcharge(found, "overhead"),
        contingency=read_surcharge(found, "contingency"),
    )


def read_usable(found: Found) -> Fraction:
    """Return the share of complete records that can be used."""
    usable = found["usable"].number(above=0, most=1) if "usable" in found else None
    return Fraction(1) if usable is None else usable


def read_surcharge(found: Found, key: str) -> Fraction:
    """Return overhead or contingency as a share."""
    share = found[key].number(least=0, most=LARGEST_SURCHARGE) if key in found else None
    return share or Fraction(0)


def read_budget(found: Found) -> Fraction | None:
    """Return the most that the study may cost."""
    return found["budget"].number(least=0, places=PRICE_PLACES) if "budget" in found else None


def read_frame_size(found: Found) -> int | None:
    """Return the number of units that can be started at most."""
    return found["frame_size"].integer(least=1) if "frame_size" in found else None


def read_design_effect(
    found: Found, routes: Collection[str]
) -> float | dict[str, float] | ClusterDesign:
    """Return the design effect of the contrast: a number, one a route, or the clusters."""
    given = [found[key] for key in ("design_effect", "clusters") if key in found]
    if len(given) > 1:
        given[1].fault(
            "stands beside 'design_effect', which it would give.", "Keep one of the two."
        )
    if not given:
        return 1.0
    if "clusters" in found:
        return read_clusters(found["clusters"])
    if not given[0].is_mapping:
        return float(given[0].number(above=0) or 1)
    parts = given[0].entries((*routes, "clusters"))
    if "clusters" in parts and len(parts) > 1:
        parts["clusters"].fault("stands beside other entries.", "Keep the clusters only.")
    if "clusters" in parts:
        return read_clusters(parts["clusters"])
    return {route: float(place.number(above=0) or 1) for route, place in parts.items()}


def read_clusters(place: Located) -> ClusterDesign:
    """Return ``{holds: 20, icc: {treatment: 0.3, outcome: 0.05}}``."""
    found = place.entries(("holds", "icc"))
    icc = found["icc"].entries(("treatment", "outcome")) if "icc" in found else {}
    values: dict[str, Any] = {
        key: within[key].number(least=least, most=most) if key in within else None
        for key, within, least, most in (
            ("holds", found, 1, None),
            ("treatment", icc, 0, 1),
            ("outcome", icc, 0, 1),
        )
    }
    if any(value is None for value in values.values()):
        place.fault(
            "does not describe clusters in full.",
            "Write it like {holds: 20, icc: {treatment: 0.3, outcome: 0.05}}.",
        )
    return ClusterDesign(
        holds=float(values["holds"] or 1),
        icc_treatment=float(values["treatment"] or 0),
        icc_outcome=float(values["outcome"] or 0),
    )


def read_tolerance(found: Found) -> Tolerance:
    """Return what the user will put up with."""
    given = found["tolerance"].entries(MOST_TOLERATED) if "tolerance" in found else {}
    bounds = {key: place.number(least=0, most=MOST_TOLERATED[key]) for key, place in given.items()}
    return Tolerance(
        least_reliability=bounds.get("least_reliability"),
        bias=bounds.get("bias"),
        first_stage_f=bounds.get("first_stage_F"),
    )


def read_waves(found: Found) -> tuple[str, ...]:
    """Return the names of the waves, first to last."""
    return tuple(found["waves"].names()) if "waves" in found else ()


def read_routes(found: Found, known: Collection[str]) -> tuple[str, ...]:
    """Return the routes that may be taken, in their usual order; all where none is named."""
    if "routes" not in found:
        return tuple(known)
    named = found["routes"].names()
    for name, place in named.items():
        if name not in known:
            place.fault(
                f"names the route '{name}', which is not there.", place.source.nearest(name, known)
            )
    if not named:
        found["routes"].fault(
            "allows no route.", f"Name any of {', '.join(known)}, or leave it out."
        )
    return tuple(route for route in known if route in named)

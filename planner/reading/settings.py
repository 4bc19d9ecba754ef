"""The keys of a study file that stand alone: size, fieldwork, tolerance, money, waves, routes."""

from collections.abc import Collection, Mapping
from fractions import Fraction
from typing import Any

from costs.located import Located
from costs.prices import MOST_RECORDS, Burden, Terms
from costs.reading import PRICE_PLACES
from planner.study import ClusterDesign, Tolerance

__all__ = [
    "read_budget",
    "read_design_effect",
    "read_frame_size",
    "read_routes",
    "read_terms",
    "read_text",
    "read_tolerance",
    "read_waves",
]

LARGEST_SURCHARGE = 10
"""A share: 10 is ten times the direct costs, so a larger one was meant in per cent."""
TARGETS = ("half_width", "detect", "power", "spend")
SIZE_KEYS = ("records", *TARGETS, "confidence", "in")

Found = Mapping[str, Located]
"""The keys of a study file, those of ``fieldwork`` among them."""


def read_text(found: Found, key: str) -> str:
    """Return a text on one line, empty where there is none."""
    return (found[key].line() or "") if key in found else ""


def read_terms(found: Found, burdens: Mapping[str, Burden]) -> Terms | None:
    """Return the number of records, and what is lost and added; None if that is at fault."""
    records = read_records(found["size"]) if "size" in found else None
    usable = read_usable(found)
    overhead, contingency = read_surcharge(found, "overhead"), read_surcharge(found, "contingency")
    if records is None:
        return None
    return Terms(
        records=records,
        usable=usable,
        burdens=burdens,
        overhead=overhead,
        contingency=contingency,
    )


def read_records(place: Located) -> int | None:
    """Return the number of complete records in ``size: {records: 400}``."""
    found = place.entries(SIZE_KEYS)
    if "confidence" in found:
        found["confidence"].number(above=0, below=1)
    if "in" in found:
        found["in"].choice(("units",))
    targets = [key for key in TARGETS if key in found]
    for key in targets:
        found[key].fault(
            "asks for a stated precision, but only 'records' is possible yet.",
            "Write 'size: {records: 400}', the number of complete records.",
        )
    if "records" in found:
        return found["records"].integer(least=1, most=MOST_RECORDS)
    if not targets and (place.is_mapping or place.is_empty):
        place.fault("does not say how many records.", "Write 'size: {records: 400}'.")
    return None


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
    keys = ("least_reliability", "bias", "first_stage_F")
    given = found["tolerance"].entries(keys) if "tolerance" in found else {}
    least = (
        given["least_reliability"].number(least=0, most=1) if "least_reliability" in given else None
    )
    bias = given["bias"].number(least=0) if "bias" in given else None
    strength = given["first_stage_F"].number(least=0) if "first_stage_F" in given else None
    return Tolerance(
        least_reliability=least,
        bias=None if bias is None else float(bias),
        first_stage_f=None if strength is None else float(strength),
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

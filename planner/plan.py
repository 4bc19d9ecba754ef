"""Answers as frozen data, full numbers and reasons; and the same as plain values for JSON."""

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import isfinite
from typing import Literal

from costs.bill import Bill
from costs.money import plain_number
from planner.findings import Reason
from planner.precision import Precision
from planner.study import Effect, Size, Study
from planner.version import VERSION
from planner.words import estimand, sentence

__all__ = [
    "Buy",
    "EffectAnswer",
    "Exceeded",
    "Plan",
    "Recommendation",
    "Role",
    "RouteAnswer",
    "RouteStatus",
    "StudyStatus",
]

StudyStatus = Literal["recommended", "impossible", "over_limits", "no_effect"]
RouteStatus = Literal["feasible", "impossible", "over_limits"]
Role = Literal["covariate", "instrument", "mediator"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Buy:
    """What is bought, for which money, and how sure it is that nothing cheaper would do."""

    measure: Mapping[str, str]
    """The way that each variable is measured: treatment, outcome, then the others by name."""
    bill: Bill
    lower_bound: Fraction
    """Nothing that serves costs less."""

    @property
    def proved(self) -> bool:
        """Whether nothing cheaper would do."""
        return self.lower_bound == self.bill.total


@dataclass(frozen=True, kw_only=True, slots=True)
class Plan:
    """How one route would be taken, and why with these variables."""

    covariates: tuple[str, ...]
    instruments: tuple[str, ...]
    mediators: tuple[str, ...]
    buy: Buy
    precision: Precision | None
    """What it achieves; None where the strengths are not known."""
    extras: Mapping[str, Fraction | None]
    """Measured variables that validity does not need, with what the same precision would cost more
    without each; None where a limit would break without it."""
    narrowest: float | None
    """Where money is given: no study within the limits has a smaller half-width."""
    needed: Mapping[str, Reason]
    """For each measured variable, what would go wrong without it."""
    left_out: Mapping[str, Reason]
    """For each measurable variable that is not measured, why not."""
    never: tuple[str, ...]
    """Those among the left out that must never be conditioned on."""

    def role(self, variable: str) -> Role | None:
        """Return the part that a variable plays besides treatment and outcome; None if none."""
        parts: dict[Role, tuple[str, ...]] = {
            "covariate": self.covariates,
            "instrument": self.instruments,
            "mediator": self.mediators,
        }
        return next((role for role, names in parts.items() if variable in names), None)


@dataclass(frozen=True, slots=True)
class Exceeded:
    """A limit that is in the way."""

    limit: str
    """``budget``, ``frame_size``, ``least_reliability``, ``bias``, ``first_stage_F``, ``records``
    or ``burdens.NAME``."""
    allowed: Fraction
    needed: Fraction
    proved: bool = True
    """Whether no plan without this limit costs less than the one that needs so much."""


@dataclass(frozen=True, kw_only=True, slots=True)
class RouteAnswer:
    """What can be said of one route."""

    route: str
    status: RouteStatus
    reason: Reason
    plan: Plan | None = None
    beyond: Plan | None = None
    """The cheapest plan without the limit that is in the way."""
    exceeds: tuple[Exceeded, ...] = ()
    witnesses: tuple[Reason, ...] = ()
    """What shows that the route is impossible, piece by piece."""


@dataclass(frozen=True, kw_only=True, slots=True)
class EffectAnswer:
    """What can be said of one effect."""

    effect: Effect
    recommended: str | None
    routes: tuple[RouteAnswer, ...]

    def answer(self, route: str) -> RouteAnswer:
        """Return what can be said of a route that the study allows."""
        return next(each for each in self.routes if each.route == route)


@dataclass(frozen=True, kw_only=True, slots=True)
class Recommendation:
    """The whole answer to a study."""

    study: Study
    status: StudyStatus
    buy: Buy | None
    effects: tuple[EffectAnswer, ...]

    def as_dict(self) -> dict[str, object]:
        """Return the answer as plain values, as ``recommend --json`` prints it.

        Format 1; keys are only ever added to it.
        """
        study = self.study
        return {
            "format": 1,
            "tool": f"measurewise {VERSION}",
            "inputs": {
                "study": study.digest,
                "prices": [source.digest for source in study.price_sources],
                "changes": list(study.changes),
            },
            "title": study.title,
            "unit": study.unit,
            "currency": study.currency,
            "size": size_values(study.size),
            "status": self.status,
            "buy": None if self.buy is None else buy_values(self.buy, study),
            "effects": [effect_values(each, study) for each in self.effects],
        }


def effect_values(answer: EffectAnswer, study: Study) -> dict[str, object]:
    """Return what is said of one effect."""
    return {
        "treatment": answer.effect.treatment,
        "outcome": answer.effect.outcome,
        "recommended": answer.recommended,
        "routes": [route_values(each, answer.effect, study) for each in answer.routes],
    }


def route_values(answer: RouteAnswer, effect: Effect, study: Study) -> dict[str, object]:
    """Return what is said of one route."""

    def plan(plan: Plan | None) -> dict[str, object] | None:
        return None if plan is None else plan_values(plan, answer.route, effect, study)

    return {
        "route": answer.route,
        "status": answer.status,
        "estimand": estimand(answer.route, study),
        "reason": reason_values(answer.reason, effect, answer.route, study),
        "witnesses": [
            reason_values(each, effect, answer.route, study) for each in answer.witnesses
        ],
        "plan": plan(answer.plan),
        "beyond": plan(answer.beyond),
        "exceeds": [
            {
                "limit": each.limit,
                "allowed": plain_number(each.allowed),
                "needed": plain_number(each.needed),
                "proved": each.proved,
            }
            for each in answer.exceeds
        ],
    }


def reason_values(reason: Reason, effect: Effect, route: str, study: Study) -> dict[str, object]:
    """Return a reason with its words."""
    return {
        "kind": reason.kind,
        "path": list(reason.trail.names),
        "variables": list(reason.variables),
        "text": sentence(reason, effect, route, study.unmeasurable),
    }


def plan_values(plan: Plan, route: str, effect: Effect, study: Study) -> dict[str, object]:
    """Return a plan with its reasons."""

    def each(reasons: Mapping[str, Reason]) -> list[dict[str, object]]:
        return [
            {"variable": name, **reason_values(reason, effect, route, study)}
            for name, reason in reasons.items()
        ]

    return {
        "roles": {
            "covariates": list(plan.covariates),
            "instruments": list(plan.instruments),
            "mediators": list(plan.mediators),
        },
        "buy": buy_values(plan.buy, study),
        "precision": None if plan.precision is None else precision_values(plan),
        "extras": [
            {"variable": name, "saves": None if saves is None else plain_number(saves)}
            for name, saves in plan.extras.items()
        ],
        "needed": each(plan.needed),
        "left_out": each(plan.left_out),
        "never": list(plan.never),
    }


def precision_values(plan: Plan) -> dict[str, object]:
    """Return what a plan achieves; a half-width or a variance without end is null."""
    precision = plan.precision
    assert precision is not None, "precision was worked out"
    values: dict[str, object] = {
        "effect": precision.effect,
        "limit": precision.limit,
        "variance": precision.variance if isfinite(precision.variance) else None,
        "bias_bound": precision.bias_bound,
        "bias_sources": dict(precision.bias_sources),
        "half_width": precision.half_width if isfinite(precision.half_width) else None,
        "power": precision.power,
        "coverage": precision.coverage,
        "first_stage_F": precision.first_stage_f,
    }
    if plan.narrowest is not None:
        values["least_half_width"] = plan.narrowest
    return values


def size_values(size: Size) -> dict[str, object]:
    """Return how large the study is to be, as a study file says it."""
    values: dict[str, object] = {
        "records": size.records,
        "half_width": size.half_width,
        "detect": "implied" if size.implied else size.detect,
        "spend": None if size.spend is None else plain_number(size.spend),
    }
    values = {key: value for key, value in values.items() if value is not None}
    if "detect" in values:
        values["power"] = size.power
    if size.confidence != Size().confidence:
        values["confidence"] = size.confidence
    if size.in_units:
        values["in"] = "units"
    return values


def buy_values(buy: Buy, study: Study) -> dict[str, object]:
    """Return a purchase with its bill."""
    bill = buy.bill
    burdens = study.terms.burdens
    return {
        "measure": dict(buy.measure),
        "components": list(bill.components),
        "records": bill.records,
        "started": bill.started,
        "bill": [
            {
                "kind": line.kind,
                "name": line.name,
                "units": line.units,
                "setup": plain_number(line.setup),
                "per_unit": plain_number(line.per_unit),
                "batches": plain_number(line.batches),
                "burdens": plain_number(line.burdens),
                "amount": plain_number(line.amount),
            }
            for line in bill.lines
        ],
        "burdens": {
            name: {
                "takes": plain_number(taken),
                "limit": None if (limit := burdens[name].limit) is None else plain_number(limit),
            }
            for name, taken in bill.burdens.items()
        },
        "cost": {
            "total": plain_number(bill.total),
            "setup": plain_number(bill.setup),
            "per_unit": plain_number(bill.next_unit),
            "lower_bound": plain_number(buy.lower_bound),
            "proved": buy.proved,
        },
    }

"""The linear model that a study's strengths describe: coefficients, and the effect they imply.

Every variable has variance 1; a coefficient belongs to each arrow, and the noise of a variable
takes what its causes leave. Plain Python: ``check`` uses it without a library for numbers.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from graphlib import TopologicalSorter
from math import fsum, inf, sqrt

from costs.located import listed, shortened
from planner.diagram import Diagram, Nodes
from planner.strengths import explained_share, loadings
from planner.study import HIDDEN, Effect, HiddenCause, Range, Study, Variable

__all__ = [
    "Coefficients",
    "LinearModel",
    "coefficients_of",
    "diagram_of",
    "effect_wanted",
    "implied_effect",
    "is_learnable",
    "largest_effect",
    "linear_model",
    "missing_in_words",
    "missing_strengths",
    "model_as_drawn",
    "outcome_explained",
    "spread",
    "units_per_unit",
    "why_zero",
]

ROUNDING = 1e-12
"""Sums this much smaller than their parts are zero."""

Coefficients = Mapping[str, Mapping[str, float | None]]
"""For each variable the coefficient of each cause; None where it is unknown."""


def diagram_of(study: Study) -> Diagram:
    """Return the study's diagram, hidden common causes as nodes of their own."""
    return Diagram.of(coefficients_of(study.variables, study.hidden_causes, study.default_strength))


def likely(strength: Range | None) -> float | None:
    """Return the single number of a range."""
    return None if strength is None else strength.likely


def coefficients_of(
    variables: Mapping[str, Variable], hidden: Iterable[HiddenCause], default: Range | None
) -> dict[str, dict[str, float | None]]:
    """Return the coefficient of every arrow, hidden common causes among the causes.

    An arrow without a strength of its own takes the default. So does each arrow of a hidden common
    cause without one; a strength of a hidden cause is the correlation that it induces.
    """
    causes: dict[str, dict[str, float | None]] = {
        name: {cause: likely(strength or default) for cause, strength in variable.causes.items()}
        for name, variable in variables.items()
    }
    for each in hidden:
        both = likely(each.strength)
        pair = (likely(default), likely(default)) if both is None else loadings(both)
        for name, loading in zip(each.of, pair, strict=True):
            causes[name][each.name] = loading
    return causes | {each.name: {} for each in hidden}


@dataclass(frozen=True, kw_only=True, slots=True)
class LinearModel:
    """What the strengths say of the variables that matter to one effect."""

    names: tuple[str, ...]
    """Causes before their effects."""
    coefficients: Mapping[str, Mapping[str, float]]
    """For each of the names the coefficient of each cause, which is among the names."""
    effect: float
    """τ, the total effect of the treatment on the outcome: Σ over directed paths of products."""


def modelled(study: Study, effect: Effect, diagram: Diagram) -> Nodes:
    """Return the variables whose strengths an answer hangs on.

    The treatment, the outcome, S, the measurable non-descendants of the treatment, the measurable
    variables that the effect runs through, and all their ancestors.
    """
    x, y = diagram.numbers[effect.treatment], diagram.numbers[effect.outcome]
    measurable = diagram.nodes(study.prices.ways)
    before = measurable - diagram.descendants([x])
    through = measurable & diagram.causal_nodes(x, y)
    return diagram.ancestors({x, y} | before | through | diagram.nodes(study.selected_by))


def causes_needed(study: Study, effect: Effect) -> dict[str, dict[str, float | None]]:
    """Return the coefficients into the variables that an answer hangs on."""
    causes = coefficients_of(study.variables, study.hidden_causes, study.default_strength)
    diagram = Diagram.of(causes)
    needed = diagram.named(sorted(modelled(study, effect, diagram)))
    return {name: causes[name] for name in needed}


def missing_strengths(study: Study, effect: Effect) -> list[tuple[str, str]]:
    """Return the arrows, as (cause, effect), that have no strength and need one."""
    needed = causes_needed(study, effect)
    return [(cause, name) for name, into in needed.items() for cause in into if into[cause] is None]


def missing_in_words(study: Study, effect: Effect, most: int = 12) -> str:
    """Return which strengths are missing, the first ``most`` by name; empty where none is."""
    # The two arrows of a hidden common cause share one strength.
    names = dict.fromkeys(
        f"({cause})" if cause.startswith(HIDDEN) else f"{cause} → {name}"
        for cause, name in missing_strengths(study, effect)
    )
    count = "1 strength is" if len(names) == 1 else f"{len(names):,} strengths are"
    return f"{count} missing: {listed(names, most)}" if names else ""


def linear_model(study: Study, effect: Effect) -> LinearModel | None:
    """Return what the strengths say, the outcome's arrows scaled to the effect to be detected.

    With ``size: {detect: δ}`` the arrows from the treatment and from what the effect runs through
    into the outcome are multiplied by δ/|τ|. None where a strength that matters is missing.
    """
    model = model_as_drawn(study, effect)
    wanted = effect_wanted(study, effect)
    if model is None or wanted is None or not model.effect:
        return model
    return scaled(model, effect, wanted / abs(model.effect))


def model_as_drawn(study: Study, effect: Effect) -> LinearModel | None:
    """Return what the strengths say, whatever is to be detected; None where one is missing."""
    needed = causes_needed(study, effect)
    known = {
        name: {c: b for c, b in into.items() if b is not None} for name, into in needed.items()
    }
    if any(len(known[name]) < len(into) for name, into in needed.items()):
        return None
    # Lists in the order of the study: the same sums, in the same order, on any machine.
    order = tuple(TopologicalSorter({n: list(into) for n, into in known.items()}).static_order())
    implied = implied_effect(known, order, effect)
    return LinearModel(names=order, coefficients=known, effect=implied)


def scaled(model: LinearModel, effect: Effect, factor: float) -> LinearModel:
    """Return the model with the arrows that carry the effect into the outcome multiplied."""
    carrying = {effect.treatment}
    for name in model.names:
        if not carrying.isdisjoint(model.coefficients[name]):
            carrying.add(name)
    into_outcome = {
        cause: b * factor if cause in carrying else b
        for cause, b in model.coefficients[effect.outcome].items()
    }
    coefficients = {**model.coefficients, effect.outcome: into_outcome}
    return replace(model, coefficients=coefficients, effect=model.effect * factor)


def largest_effect(model: LinearModel, effect: Effect, most: float) -> float | None:
    """Return the largest effect, in SDs per SD, that leaves the outcome explained to ``most``.

    None where smaller effects need not fit, or where the share takes too long to say.
    """
    # Twice: far from the answer, rounding takes the smaller terms.
    for _ in range(2):
        factor = largest_factor(model, effect, most)
        if factor is None:
            return None
        model = scaled(model, effect, factor)
    return abs(model.effect)


def largest_factor(model: LinearModel, effect: Effect, most: float) -> float | None:
    """Return how many times as strong the arrows may be that carry the effect into the outcome.

    With f times their strength the outcome is explained to a·f² + b·f + c; that share is known at
    f = -1, 0 and 1. None where the other causes alone explain too much (c ≥ most).
    """
    shares = [outcome_explained(scaled(model, effect, f), effect.outcome) for f in (-1, 0, 1)]
    back, c, ahead = (inf if share is None else share for share in shares)
    a, b = (ahead + back) / 2 - c, (ahead - back) / 2
    if not (c < most and 0 < a < inf):
        return None
    return (sqrt(b * b + 4 * a * (most - c)) - b) / (2 * a)


def implied_effect(
    coefficients: Mapping[str, Mapping[str, float]], order: Sequence[str], effect: Effect
) -> float:
    """Return τ: Σ over directed paths of the product of their coefficients (Wright 1921).

    What a unit of the treatment adds to each variable, in the order of causes; sums that cancel up
    to rounding are 0.
    """
    added = {effect.treatment: 1.0}
    for name in order:
        terms = [b * added[cause] for cause, b in coefficients[name].items() if added.get(cause)]
        if name != effect.treatment and terms:
            total = fsum(terms)
            cancels = abs(total) <= ROUNDING * fsum(map(abs, terms))
            added[name] = 0.0 if cancels else total
    return added.get(effect.outcome, 0.0)


def effect_wanted(study: Study, effect: Effect) -> float | None:
    """Return the size of effect to be detected, in SDs per SD; None where no other is named."""
    if study.size.detect is None:
        return None
    return study.size.detect / units_per_unit(study, effect)


def units_per_unit(study: Study, effect: Effect) -> float:
    """Return what an effect of one outcome SD per treatment SD is in the units of the answer.

    With ``in: units`` that is sd_y / sd_x; otherwise 1.
    """
    if not study.size.in_units:
        return 1.0
    outcome, treatment = spread(study, effect.outcome), spread(study, effect.treatment)
    assert outcome, "what is asked in natural units has standard deviations"
    assert treatment, "what is asked in natural units has standard deviations"
    return outcome / treatment


def spread(study: Study, name: str) -> float | None:
    """Return the SD of a variable in natural units, √(p(1−p)) for a yes/no variable, if known."""
    variable = study.variables[name]
    if variable.share is not None:
        return sqrt(variable.share * (1 - variable.share))
    return variable.sd


def outcome_explained(model: LinearModel, outcome: str) -> float | None:
    """Return the share of the outcome that its causes explain; None if it takes too long to say."""
    return explained_share(model.coefficients, model.names, outcome)


def is_learnable(study: Study, effect: Effect) -> bool:
    """Say whether a route can lead to the effect, as far as treatment, outcome and S tell.

    It takes a directed path, and no selection after the treatment.
    """
    diagram = diagram_of(study)
    after = diagram.descendants([diagram.numbers[effect.treatment]])
    return diagram.numbers[effect.outcome] in after and after.isdisjoint(
        diagram.nodes(study.selected_by)
    )


def why_zero(model: LinearModel, effect: Effect) -> str:
    """Return in words why the strengths make an effect zero although directed paths lead there."""
    ends = f"from {shortened(effect.treatment)} to {shortened(effect.outcome)}"
    sizes = {n: {c: abs(b) for c, b in into.items()} for n, into in model.coefficients.items()}
    # Without a minus sign nothing cancels: what is zero even then is so path by path.
    if implied_effect(sizes, model.names, effect):
        return f"the directed paths {ends} cancel"
    return f"each directed path {ends} has an arrow of strength 0"

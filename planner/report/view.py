"""What every report shows: words and rounded numbers, in order, with no arithmetic left to do."""

from dataclasses import dataclass
from fractions import Fraction

from planner.plan import EffectAnswer, Plan, Recommendation, RouteAnswer
from planner.report.achieved import effect_unit, interval_name, joint_errors, leanings
from planner.report.answers import (
    answer_sentences,
    cautions,
    closing_notes,
    same_for_all,
)
from planner.report.rows import (
    BillRow,
    Bought,
    Note,
    RouteRow,
    bill_rows,
    bought_rows,
    burden_notes,
    left_out_notes,
    precision_notes,
    route_row,
    sum_notes,
)
from planner.routes import ROUTES
from planner.study import Effect, Study
from planner.words import conjoined

__all__ = ["View", "view_of"]


@dataclass(frozen=True, kw_only=True, slots=True)
class View:
    """A whole report."""

    title: str
    subject: str
    currency: str
    answer: tuple[str, ...]
    shown_plan: str
    """Whose measurement list and bill are shown; empty where the plan is the recommended one."""
    bought: tuple[Bought, ...]
    sums: tuple[Note, ...]
    """Surcharges and the total, for its foot."""
    never: tuple[Note, ...]
    """What must not be adjusted for, and why."""
    leans_on: tuple[str, ...]
    cautions: tuple[str, ...]
    bill: tuple[BillRow, ...]
    burdens: tuple[Note, ...]
    routes: tuple[RouteRow, ...]
    """Empty where one reason closes them all."""
    interval: str
    """What the confidence interval is called."""
    effect_unit: str
    """In what units effects and intervals are told."""
    precision: tuple[Note, ...]
    """What the shown plan achieves, line by line."""
    left_out: tuple[Note, ...]
    """What is of no use, and why."""
    notes: tuple[str, ...]


def view_of(answer: Recommendation) -> View:
    """Return what a report on an answer shows."""
    study, (effect_answer,) = answer.study, answer.effects
    effect = effect_answer.effect
    shown = shown_route(effect_answer)
    plan = None if shown is None else shown.plan or shown.beyond
    buy = answer.buy or (plan.buy if plan else None)
    route = shown.route if shown else ""
    return View(
        title=study.title,
        subject=subject(study, effect),
        currency=study.currency,
        answer=tuple(answer_sentences(answer, effect_answer)),
        shown_plan="" if answer.buy or not shown else ROUTES[route].words.title,
        bought=tuple(bought_rows(plan, route, effect, study)) if plan else (),
        sums=tuple(sum_notes(plan.buy.bill)) if plan else (),
        never=left_out_notes(plan, route, effect, study, only_never=True) if plan else (),
        leans_on=leaning(study, effect, route, plan) if plan else (),
        cautions=tuple(cautions(buy, study)) if buy else (),
        bill=tuple(bill_rows(buy.bill)) if buy else (),
        burdens=tuple(burden_notes(buy, study)) if buy else (),
        routes=()
        if same_for_all(effect_answer)
        else tuple(
            route_row(
                each,
                effect,
                study,
                is_recommended=each.route == effect_answer.recommended,
                is_shown=each is shown,
            )
            for each in effect_answer.routes
        ),
        interval=interval_name(study),
        effect_unit=effect_unit(study, effect, "SDs (standard deviations)"),
        precision=tuple(precision_notes(plan, study, effect)) if plan else (),
        left_out=left_out_notes(plan, route, effect, study, only_never=False) if plan else (),
        notes=tuple(closing_notes(study, route, plan, buy)),
    )


DIAGRAM = "the diagram: an arrow that is missing from it can undo any plan"
STRENGTHS = (
    "the diagram and its strengths: a missing arrow can undo any plan, and records and bias are"
    " only as good as the strengths"
)
LINES = "effects that follow straight lines: the planned analysis is linear"


def leaning(study: Study, effect: Effect, route: str, plan: Plan) -> tuple[str, ...]:
    """Return all that the shown price leans on."""
    diagram = DIAGRAM if plan.precision is None else STRENGTHS
    return (*leanings(study, effect, route, plan), *joint_errors(study, plan), diagram, LINES)


def shown_route(answer: EffectAnswer) -> RouteAnswer | None:
    """Return the recommended route, or the one that comes nearest; None if there is none."""
    if answer.recommended is not None:
        return answer.answer(answer.recommended)
    beyond = [(each.beyond.buy.bill.total, each) for each in answer.routes if each.beyond]
    return min(beyond, key=lambda pair: pair[0], default=(Fraction(0), None))[1]


def subject(study: Study, effect: Effect) -> str:
    """Return what is asked, and what one unit is."""
    among = f", among rows selected by {conjoined(study.selected_by)}" if study.selected_by else ""
    one = "" if study.unit == "unit" else f" One unit is one {study.unit}."
    return f"The effect of {effect.treatment} on {effect.outcome}{among}.{one}"

"""The study as plain, frozen data: what is asked, the diagram's arrows, what can be bought."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date
from fractions import Fraction

from costs.prices import PriceList, Terms

__all__ = [
    "HIDDEN",
    "ClusterDesign",
    "Effect",
    "HiddenCause",
    "PriceSource",
    "Range",
    "Size",
    "Study",
    "Tolerance",
    "Variable",
    "shown_time",
]

USUAL_F = Fraction(20)
HIDDEN = "hidden common cause of "
"""How the name of a common cause that has none of its own begins."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Effect:
    """The effect that is asked for."""

    treatment: str
    outcome: str


@dataclass(frozen=True, kw_only=True, slots=True)
class Range:
    """A number that is known as a range; a plain number is a range of no width."""

    low: float
    likely: float
    """What is used where a single number is wanted."""
    high: float

    def __post_init__(self) -> None:
        assert self.low <= self.likely <= self.high, "a range runs upwards"


@dataclass(frozen=True, kw_only=True, slots=True)
class Variable:
    """A node of the diagram."""

    name: str
    label: str = ""
    causes: Mapping[str, Range | None]
    """The variables with an arrow into this one, and how strong it is; None where unknown."""
    when: Fraction | None = None
    """When it is set or read; a cause is never later than its effect."""
    sd: float | None = None
    """Standard deviation in natural units."""
    share: float | None = None
    """For a yes/no variable, the share of yes."""
    care: bool = False
    """Measuring it can hurt someone, whichever way is taken."""
    texts: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, kw_only=True, slots=True)
class HiddenCause:
    """An unmeasurable common cause of two variables that needs no name of its own."""

    of: tuple[str, str]
    name: str
    """Its name as a node of the diagram."""
    strength: Range | None = None
    """The correlation that it induces."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Size:
    """How large the study is to be: by its records, or by what it is to achieve.

    Just one of ``records``, ``half_width``, ``detect`` (or ``implied``) and ``spend`` is given.
    """

    records: int | None = None
    """Complete records, whatever they achieve."""
    half_width: float | None = None
    """Of the confidence interval of the effect."""
    detect: float | None = None
    """The size of effect that is to be detected."""
    implied: bool = False
    """The effect that the strengths imply is to be detected."""
    power: float = 0.8
    """With which probability it is to be detected."""
    spend: Fraction | None = None
    """The money that is to buy as narrow an interval as it can."""
    confidence: float = 0.95
    in_units: bool = False
    """Effects are in natural units, not in outcome SDs per treatment SD."""

    @property
    def is_target(self) -> bool:
        """Whether the number of records is to be worked out."""
        return self.records is None


@dataclass(frozen=True, kw_only=True, slots=True)
class Tolerance:
    """What the user will put up with."""

    least_reliability: Fraction | None = None
    bias: Fraction | None = None
    """Share of the effect."""
    first_stage_f: Fraction | None = None
    """Least first-stage F of an instrument; None where nobody said."""

    @property
    def floor_of_f(self) -> Fraction:
        """The least first-stage F: 20 where nobody said, so that nine in ten studies see 10."""
        return USUAL_F if self.first_stage_f is None else self.first_stage_f


@dataclass(frozen=True, kw_only=True, slots=True)
class ClusterDesign:
    """Units come in clusters: how many in each, and how alike they are in one."""

    holds: float
    icc_treatment: float
    icc_outcome: float


@dataclass(frozen=True, kw_only=True, slots=True)
class PriceSource:
    """A price-list file that was read."""

    path: str
    digest: str
    valid_until: date | None
    unread: tuple[str, ...] = ()
    """Sheets of a workbook that hold something, but no price table."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Study:
    """All that a study file and its price lists say, checked."""

    title: str
    unit: str
    """What one row of the data is."""
    currency: str
    """Empty where none is named."""
    effects: tuple[Effect, ...]
    variables: Mapping[str, Variable]
    """By name, in the order of the file."""
    hidden_causes: tuple[HiddenCause, ...] = ()
    prices: PriceList
    """Ways of the study's variables only; a variable without one cannot be measured."""
    size: Size
    terms: Terms
    """For ``size.records`` records; at a target for one, until a plan has worked out how many."""
    budget: Fraction | None = None
    frame_size: int | None = None
    tolerance: Tolerance = Tolerance()
    design_effect: float | Mapping[str, float] | ClusterDesign = 1.0
    """One number, one for each route, or what it follows from."""
    default_strength: Range | None = None
    """The strength of arrows that have none of their own."""
    routes: tuple[str, ...]
    """The routes that may be taken, in their usual order."""
    selected_by: tuple[str, ...] = ()
    """Variables that have one and the same value in every row."""
    waves: tuple[str, ...] = ()
    unchecked_strengths: int = 0
    """Variables of which it would take too long to say whether they are explained to 100 %."""
    path: str = ""
    digest: str = ""
    price_sources: tuple[PriceSource, ...] = ()
    changes: tuple[str, ...] = ()
    """What was asked for on the command line in place of what the files say."""

    @property
    def unmeasurable(self) -> frozenset[str]:
        """The variables that no way measures."""
        return frozenset(name for name in self.variables if name not in self.prices.ways)


def shown_time(when: Fraction, waves: Sequence[str]) -> str:
    """Return a time as a study writes it: by the name of its wave, where there are waves.

    Examples
    --------
    >>> shown_time(Fraction(2), ["first", "second"]), shown_time(Fraction(1, 2), [])
    ('second', '0.5')
    """
    if waves and when.denominator == 1 and 1 <= when <= len(waves):
        return waves[int(when) - 1]
    return f"{float(when):g}"

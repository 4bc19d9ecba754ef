"""What a plan has to stay within, and on what terms things are bought."""

from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING

from costs.bill import Bill
from costs.prices import PriceList, Terms

if TYPE_CHECKING:
    from planner.precision import Demand

__all__ = ["Within"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Within:
    """The price list, the terms and the limits of one search; a limit that is None is not there."""

    prices: PriceList
    """Only ways that may be taken."""
    terms: Terms
    """With the limits of the burdens."""
    budget: Fraction | None = None
    frame_size: int | None = None
    spend: Fraction | None = None
    """The money that is to buy as narrow an interval as it can."""
    demand: "Demand | None" = None
    """What is demanded of the estimate; None where the strengths are not known."""

    def broken(self, bill: Bill) -> tuple[str, ...]:
        """Return the names of the limits that a bill breaks."""
        broken = []
        if self.budget is not None and bill.total > self.budget:
            broken.append("budget")
        if self.frame_size is not None and bill.started > self.frame_size:
            broken.append("frame_size")
        for name, burden in self.terms.burdens.items():
            if burden.limit is not None and bill.burdens[name] > burden.limit:
                broken.append(f"burdens.{name}")
        return tuple(broken)

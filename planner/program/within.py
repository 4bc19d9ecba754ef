"""What a plan has to stay within, and on what terms things are bought."""

from dataclasses import dataclass
from fractions import Fraction

from costs.bill import Bill
from costs.prices import PriceList, Terms

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

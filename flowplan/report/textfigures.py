"""Lengths as short text: one unit and one number of decimals for everything shown together."""

import math
from collections.abc import Iterable
from dataclasses import dataclass
from statistics import median

from flowplan.units import convert

_MOST_DECIMALS = 6


@dataclass(frozen=True, slots=True)
class Figures:
    """How lengths are written.

    Attributes
    ----------
    unit : str
        The unit shown, a length in `flowplan.units.UNITS`.
    decimals : int
        Digits after the point.
    """

    unit: str
    decimals: int

    @classmethod
    def fitting(cls, unit: str, lengths_nm: Iterable[float], digits: int = 4) -> "Figures":
        """Choose the decimals so that the median of some lengths [nm] shows this many digits."""
        sizes = [abs(convert(v, "nm", unit)) for v in lengths_nm if v and math.isfinite(v)]
        if not sizes:
            return cls(unit, 1)
        before_point = math.floor(math.log10(median(sizes))) + 1
        return cls(unit, min(_MOST_DECIMALS, max(0, digits - max(1, before_point))))

    def text(self, length_nm: float | None) -> str:
        """Return a length without its unit; empty for none, never ``-0.0``."""
        if length_nm is None:
            return ""
        value = convert(length_nm, "nm", self.unit)
        return f"{round(value, self.decimals) + 0.0:.{self.decimals}f}"

    def with_unit(self, length_nm: float) -> str:
        """Return a length and its unit."""
        return f"{self.text(length_nm)} {self.unit}"


def percent(share: float) -> str:
    """Return a share as a percentage that is never rounded to nothing."""
    value = 100 * share
    if 0 < value < 0.1:
        return "<0.1 %"
    return f"{value:.1f} %"

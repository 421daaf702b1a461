"""What every part of the view shares: rounding, wording of numbers, names with anchors."""

import math
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from statistics import median

from flowplan.engine.analysis import Result
from flowplan.engine.landing import LandingEntry
from flowplan.engine.results import Entry
from flowplan.model.base import WAFER
from flowplan.model.flow import Basis
from flowplan.report.records import in_unit
from flowplan.units import convert

MINUS = "\N{MINUS SIGN}"
NONE = "\N{EN DASH}"
NBSP = "\N{NO-BREAK SPACE}"
#: Figures of the middle of a report show this many significant digits.
_DIGITS = 4
#: No figure is shown finer than this.
_FINEST_NM = 0.01

BASIS_WORDS: dict[Basis, str] = {
    "mixed": "bounds added, random parts root-sum-square",
    "rss": "everything root-sum-square",
    "linear": "everything added",
}


@dataclass(frozen=True, slots=True)
class LayerName:
    """A layer as text links to it.

    Attributes
    ----------
    id : str
        As in the flow.
    anchor : str
        Of its row in the mask table, made from its place; empty for the wafer.
    """

    id: str
    anchor: str


@dataclass(frozen=True)
class Base:
    """The result with what every block needs to word it.

    Attributes
    ----------
    result : Result
        The analysis.
    """

    result: Result

    @cached_property
    def decimals(self) -> int:
        """Decimals of every length in the report, so that columns can be compared."""
        unit = self.result.flow.unit
        flow = self.result.flow
        needs = [in_unit(e.need.on(flow.basis), unit) or 0.0 for e in self.result.entries]
        return decimals_for(needs, in_unit(_FINEST_NM, unit) or 1.0)

    @cached_property
    def _unit_nm(self) -> float:
        return convert(1.0, self.result.flow.unit, "nm")

    @cached_property
    def names(self) -> dict[str, LayerName]:
        """Every layer, and the wafer, by id."""
        places = enumerate(self.result.flow.layers, start=1)
        return {WAFER: LayerName(WAFER, "")} | {name: LayerName(name, f"m{i}") for i, name in places}

    @cached_property
    def pair_places(self) -> dict[int, int]:
        """Place of each of the flow's pairs, by identity; the anchor of its fold-out is ``p`` + place."""
        pairs = dict.fromkeys(id(e.pair) for e in self.result.entries)
        return {key: i for i, key in enumerate(pairs, start=1)}

    def pair_anchor(self, entry: Entry) -> str:
        """Return the anchor of an entry's fold-out."""
        return f"p{self.pair_places[id(entry.pair)]}"

    def landing_anchor(self, entry: LandingEntry) -> str:
        """Return the anchor of a landing's row in its own table."""
        return f"landing{[id(e) for e in self.result.landings].index(id(entry)) + 1}"

    @property
    def n_pairs(self) -> int:
        """How many of the flow's pairs are shown."""
        return len(self.pair_places) + len({id(e.pair) for e in self.result.landings})

    def length(self, nm: float | None) -> str:
        """Return a length in the file's unit, without the unit's name."""
        if nm is None or not math.isfinite(nm):
            return NONE
        return number(nm / self._unit_nm, self.decimals)

    def signed(self, nm: float | None) -> str:
        """Return a length with its sign, 0 without one."""
        text = self.length(nm)
        return f"+{text}" if nm is not None and nm > 0 and text not in ("0", NONE) else text

    def plus_minus(self, nm: float) -> str:
        """Return a length that goes both ways."""
        return f"±{self.length(nm)}"


def decimals_for(values: Iterable[float], finest: float) -> int:
    """Return how many decimals show the middle of some values to four digits, but none below `finest`."""
    sizes = [abs(v) for v in values if v]
    most = round(-math.log10(finest))
    if not sizes:
        return max(0, min(1, most))
    return max(0, min(most, _DIGITS - 1 - math.floor(math.log10(median(sizes)))))


def number(value: float, decimals: int) -> str:
    """Return a number with a true minus sign; a small rest is never shown as plain zero."""
    text = f"{value:.{decimals}f}"
    if value and not float(text):
        text = f"{value:.0e}"
    elif not float(text):
        text = "0"
    return text.replace("-", MINUS)


def percent(share: float) -> str:
    """Return a share in whole percent; what is there but small is ``<1 %``."""
    if 0 < share < 0.005:
        return "<1 %"
    return f"{share * 100:.0f} %"


def capability(cpk: float | None) -> str:
    """Return a Cpk with two decimals, infinity as its sign."""
    if cpk is None:
        return NONE
    if math.isinf(cpk):
        return "∞" if cpk > 0 else f"{MINUS}∞"
    return number(cpk, 2)


def per_million(probability: float | None) -> str:
    """Return a probability in parts per million, to three digits."""
    if probability is None:
        return NONE
    ppm = probability * 1e6
    if ppm == 0:
        return "0"
    if ppm < 0.001:
        return "<0.001"
    return f"{ppm:.3g}" if ppm < 1000 else f"{ppm:.0f}"


def plain(value: float) -> str:
    """Return a number as a person would write it."""
    return f"{value:.6g}".replace("-", MINUS)


def listed(words: Iterable[str], most: int) -> str:
    """Return words as a list in a sentence; beyond `most` and one more they are counted."""
    named = list(words)
    if len(named) > most + 1:
        return f"{', '.join(named[:most])} and {len(named) - most} more"
    return " and ".join(filter(None, (", ".join(named[:-1]), *named[-1:])))


def counted(n: int, one: str, many: str = "") -> str:
    """Return a count with its noun."""
    return f"{n} {one if n == 1 else many or one + 's'}"

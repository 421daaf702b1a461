"""What each quoted size is worth, as text for tables."""

import math
from collections.abc import Iterable
from dataclasses import dataclass

from flowplan.engine.levers import Gain, Lever, Levers
from flowplan.report.records_levers import in_own_unit, own_unit
from flowplan.report.textfigures import Figures
from flowplan.units import convert

#: Headings, and whether what stands below is a figure.
LEVER_HEADINGS = (
    ("size", False), ("axis", False), ("value", True), ("halved", True), ("removed", True),
    ("mends", True), ("per unit", True), ("leads", True), ("at most", True),
)  # fmt: skip
_DIGITS = 4
#: A gain below this share of the largest is not worth a line.
_NOTHING = 1e-9


@dataclass(frozen=True, slots=True)
class LeverText:
    """Levers as text.

    Attributes
    ----------
    rows : tuple of tuple of str
        One text a heading of `LEVER_HEADINGS`.
    left_out : int
        How many sizes are worth nothing by themselves and got no row.
    legend : tuple of str
        What the columns say.
    """

    rows: tuple[tuple[str, ...], ...]
    left_out: int
    legend: tuple[str, ...]


def lever_text(found: Levers, *, every: bool = False) -> LeverText:
    """Return levers as text.

    Parameters
    ----------
    found : Levers
        What `levers` returns.
    every : bool
        Sizes that are worth nothing by themselves as well.
    """
    unit = found.flow.unit
    shown = [lever for lever in found.levers if every or _is_worth_a_line(lever)]
    figures = Figures.fitting(unit, _gains(shown), digits=3)
    return LeverText(
        tuple(_row(lever, figures) for lever in shown), len(found.levers) - len(shown), _legend(unit)
    )


def _legend(unit: str) -> tuple[str, ...]:
    return (
        f"halved, removed: what the worst margin gains, in {unit}; mends: margins that no",
        "longer fail when it is removed; per unit: change of the worst margin for one",
        "unit more; leads: margins that gain most from this size; at most: the largest",
        "value at which every pair passes (none: it cannot do that alone)",
    )


def _is_worth_a_line(lever: Lever) -> bool:
    gains = lever.removed.worst, lever.halved.worst, lever.removed.failing, lever.halved.failing
    limited = lever.largest is not None and math.isfinite(lever.largest)
    return limited or lever.dominates > 0 or any(abs(gain) > _NOTHING for gain in gains)


def _gains(levers: Iterable[Lever]) -> list[float]:
    return [gain.worst for lever in levers for gain in (lever.halved, lever.removed)]


def _row(lever: Lever, figures: Figures) -> tuple[str, ...]:
    quoted, unit = lever.quoted, figures.unit
    own = own_unit(quoted, unit)
    derivative = lever.derivative if quoted.is_length else convert(lever.derivative, "nm", unit)
    return (
        quoted.path,
        quoted.axis or "",
        f"{in_own_unit(quoted, lever.value, unit):.{_DIGITS}g}" + ("" if quoted.is_length else f" {own}"),
        _signed(lever.halved, figures),
        _signed(lever.removed, figures),
        str(lever.removed.failing or ""),
        f"{derivative + 0.0:.3g}",
        str(lever.dominates or ""),
        _at_most(lever, unit),
    )


def _signed(gain: Gain, figures: Figures) -> str:
    text = figures.text(gain.worst)
    return text if text.startswith("-") or not float(text) else f"+{text}"


def _at_most(lever: Lever, unit: str) -> str:
    if lever.largest is None:
        return "none"
    value = in_own_unit(lever.quoted, lever.largest, unit)
    return "any" if value is None else f"{rounded_down(value):.{_DIGITS}g}"


def rounded_down(value: float, digits: int = _DIGITS) -> float:
    """Return a size with few digits that is never above the exact one, so that it still serves."""
    if value <= 0:
        return 0.0
    step = 10.0 ** (math.floor(math.log10(value)) + 1 - digits)
    return math.floor(value / step * (1 + 1e-12)) * step

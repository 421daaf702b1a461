"""Measured overlay as text for tables."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from flowplan.engine.measured.fit import FIELD_TERMS, WAFER_TERMS
from flowplan.engine.measured.nested import LEVELS
from flowplan.engine.measured.sizes import Found, alignment_of
from flowplan.engine.measured.summary import AxisFigures, MeasuredReading
from flowplan.model.base import AXES, Axis
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites
from flowplan.report.measuring import Taken
from flowplan.report.textfigures import Figures
from flowplan.units import convert

Row = tuple[str, ...]
Headings = tuple[tuple[str, bool], ...]
#: What stands where the data cannot tell.
_NONE = "–"
#: Outliers listed by place, and reasons why a reading says nothing of an alignment.
_MOST_OUTLIERS = 5
_MOST_REASONS = 6


@dataclass(frozen=True, slots=True)
class TableText:
    """A table under a title: headings with whether figures stand below, rows, and what to know."""

    title: str
    headings: Headings
    rows: tuple[Row, ...]
    legend: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class MeasuredText:
    """Measured overlay as text.

    Attributes
    ----------
    heading : str
        The flow.
    counts : str
        Rows, those that cannot be read, outliers.
    unit : str
        Unit of all lengths.
    tables : tuple of TableText
        Spread beside the plan, fits, variances, alignments.
    outliers : tuple of str
        The farthest rows that do not count.
    silent : tuple of str
        Which readings say nothing about an alignment, and why.
    """

    heading: str
    counts: str
    unit: str
    tables: tuple[TableText, ...]
    outliers: tuple[str, ...]
    silent: tuple[str, ...]


def measured_text(taken: Taken) -> MeasuredText:
    """Return measured overlay as text."""
    measured = taken.measured
    flow, readings = measured.flow, measured.readings
    sizes = [f.three_sigma for r in readings for f in r.axes.values()]
    figures = Figures.fitting(flow.unit, sizes, digits=3)
    tables = [_spread(readings, figures), _wafer(readings, figures), _field(readings, figures)]
    tables.append(_variances(readings, figures))
    if taken.sizes.found:
        tables.append(_alignments(flow, taken.sizes.found, figures))
    return MeasuredText(
        flow.heading,
        counts_text(taken),
        flow.unit,
        tuple(tables),
        tuple(_outliers(taken, figures)),
        _cut(taken.sizes.silent),
    )


def counts_text(taken: Taken) -> str:
    """Return how many rows there were, could not be read, and did not count."""
    unreadable, out = taken.data.n_unreadable, taken.measured.n_outliers
    limit = taken.measured.limit
    kept = "all of them count" if limit is None else f"{out:,} left out as outliers"
    return f"{taken.data.n_rows:,} rows, {unreadable:,} cannot be read, {kept}"


def _spread(readings: Sequence[MeasuredReading], figures: Figures) -> TableText:
    rows: list[Row] = []
    for reading in readings:
        for axis, of_axis in reading.axes.items():
            first = axis == AXES[0]
            plan = of_axis.plan
            rows.append(
                (
                    reading.name if first else "",
                    axis,
                    f"{reading.tally.n}" if first else "",
                    figures.text(of_axis.mean),
                    _finite(of_axis.three_sigma, figures),
                    _finite(of_axis.mean_plus_3sigma, figures),
                    figures.text(plan.mean_plus_3sigma) if plan else _NONE,
                    ratio_text(of_axis),
                )
            )
    names = ("reading", "axis", "rows", "mean", "3 sigma", "|mean|+3s", "planned", "of plan")
    legend = (
        "mask minus reference; planned: |offset| + bound + 3 sigma of the flow at the places measured;",
        "of plan: measured over planned",
    )
    return TableText("Overlay", _headings(names, 2), tuple(rows), legend)


def ratio_text(figures: AxisFigures) -> str:
    """Return measured over planned |mean| + 3 sigma as a percentage."""
    if figures.plan is None or not figures.plan.mean_plus_3sigma or not math.isfinite(figures.sigma):
        return _NONE
    return f"{100 * figures.mean_plus_3sigma / figures.plan.mean_plus_3sigma:.0f} %"


def _finite(length: float, figures: Figures) -> str:
    return figures.text(length) if math.isfinite(length) else _NONE


def _wafer(readings: Sequence[MeasuredReading], figures: Figures) -> TableText:
    rows: list[Row] = []
    for reading in readings:
        fit = reading.fit
        terms = [_in_unit(n, fit.wafer[n], fit.wafer_errors[n], figures.unit) for n in WAFER_TERMS]
        rows.append((reading.name, *(term_text(*term) for term in terms)))
        rows.append(("  ±", *(error_text(*term) for term in terms)))
    names = ("reading", "shift x", "shift y", "scale x", "scale y", "rotation", "skew")
    legend = (
        f"shift in {figures.unit}, scale in ppm, rotation and skew in urad; below each its standard error,",
        "sites taken as independent: what a whole wafer has in common makes the true one larger",
    )
    return TableText("Linear fit over the wafer", _headings(names, 1), tuple(rows), legend)


def _field(readings: Sequence[MeasuredReading], figures: Figures) -> TableText:
    rows: list[Row] = []
    for reading in readings:
        fit = reading.fit
        left = [_finite(3 * reading.axes[axis].residual, figures) for axis in AXES]
        values, errors = fit.field, fit.field_errors
        rows.append((reading.name, *(term_text(values[n], errors[n]) for n in FIELD_TERMS), *left))
        rows.append(("  ±", *(error_text(values[n], errors[n]) for n in FIELD_TERMS), "", ""))
    names = ("reading", "magn.", "rotation", "magn. asym.", "rot. asym.", "left x", "left y")
    legend = (f"in ppm and urad; left: 3 sigma of what both fits together leave, in {figures.unit}",)
    return TableText("Linear fit over the field", _headings(names, 1), tuple(rows), legend)


def term_text(value: float | None, error: float | None) -> str:
    """Return a term of a fit to the digits that its standard error leaves."""
    return _NONE if value is None else f"{value + 0.0:.{_decimals(error)}f}"


def error_text(value: float | None, error: float | None) -> str:
    """Return a term's standard error to two digits."""
    return _NONE if value is None or error is None else f"{error:.{_decimals(error)}f}"


def _decimals(error: float | None) -> int:
    if not error:
        return 3
    return min(6, max(0, 1 - math.floor(math.log10(error))))


def _in_unit(
    name: str, value: float | None, error: float | None, unit: str
) -> tuple[float | None, float | None]:
    """Return a term and its error, a shift in a unit."""
    if not name.startswith("shift"):
        return value, error
    shift, doubt = (None if v is None else convert(v, "nm", unit) for v in (value, error))
    return shift, doubt


def _variances(readings: Sequence[MeasuredReading], figures: Figures) -> TableText:
    rows: list[Row] = []
    for reading in readings:
        for axis, of_axis in reading.axes.items():
            parts = (part_text(getattr(of_axis.split, level), figures) for level in LEVELS)
            rows.append((reading.name if axis == AXES[0] else "", axis, *parts))
    legend = (
        f"3 sigma of each part in {figures.unit}, the fit taken off;",
        f"{_NONE}: cannot be told from the one before",
    )
    return TableText("Variance by level", _headings(("reading", "axis", *LEVELS), 2), tuple(rows), legend)


def part_text(variance: float | None, figures: Figures) -> str:
    """Return three standard deviations of a component of the variance."""
    return _NONE if variance is None else figures.text(3 * math.sqrt(max(variance, 0.0)))


def _alignments(flow: Flow, found: Sequence[Found], figures: Figures) -> TableText:
    names = ("reading", "axis", "planned", "measured", "±", "offset", "note")
    pairs = [None, *((one.mask, one.reference) for one in found)]
    rows = [
        (
            "" if pairs[i] == (one.mask, one.reference) else f"{one.mask} on {one.reference}",
            one.axis,
            planned_alignment(flow, one, figures),
            f"{one.random:g}",
            _NONE if one.error is None else f"{one.error:.2g}",
            f"{one.offset:g}" if one.offset else _NONE,
            "others exceed it" if one.exceeded else "",
        )
        for i, one in enumerate(found)
    ]
    legend = (
        f"alignment at {flow.sigma:g} sigma in {flow.unit}: measured spread less the flow's other terms, ±",
        "its standard error; where others exceed what was measured the flow keeps its figure;",
        "offset: a mean beyond twice its standard error; -o NEW.yaml writes these into the flow",
    )
    headings = tuple((name, 2 <= i <= 5) for i, name in enumerate(names))
    return TableText("What it says about alignment", headings, tuple(rows), legend)


def planned_alignment(flow: Flow, found: Found, figures: Figures) -> str:
    """Return the random part of the alignment that the flow quotes for a reading."""
    mask = next(mask for mask in flow.masks if mask.id == found.mask)
    axis: Axis = found.axis
    reading = next(r for r in mask.aligns_to.on(axis) if r.mask == found.reference)
    size = alignment_of(flow.tools[mask.tool], reading)
    if size is None or isinstance(size, MarkSites) or size.random is None:
        return _NONE
    return f"{convert(size.random.on(axis).in_base(flow.unit), 'nm', figures.unit):.6g}"


def _outliers(taken: Taken, figures: Figures) -> Iterator[str]:
    for out in taken.measured.outliers[:_MOST_OUTLIERS]:
        reading = taken.measured.readings[out.reading]
        dx, dy = (figures.text(v) for v in out.overlay)
        yield f"{taken.data.place(out.row)}: {reading.name}, dx {dx}, dy {dy}, {out.ratio:.1f} sigma off"
    more = taken.measured.n_outliers - min(_MOST_OUTLIERS, len(taken.measured.outliers))
    if more > 0:
        yield f"… and {more:,} more"


def _cut(reasons: Sequence[str]) -> tuple[str, ...]:
    more = len(reasons) - _MOST_REASONS
    return (*reasons[:_MOST_REASONS], *([f"… and {more} more"] if more > 0 else []))


def _headings(names: Sequence[str], words: int) -> Headings:
    return tuple((name, i >= words) for i, name in enumerate(names))

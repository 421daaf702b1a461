"""Measured overlay in the report: plan against measured as bars, maps of mean vectors and residuals."""

import math
from dataclasses import dataclass

import numpy as np

from flowplan.engine.measured.cells import Cells
from flowplan.engine.measured.summary import Measured, MeasuredReading
from flowplan.engine.sources import N_BASIS, FloatArray
from flowplan.model.geometry import field_size, usable_radius
from flowplan.report.measured import MeasuredText, measured_text, ratio_text
from flowplan.report.measuring import Taken
from flowplan.report.textfigures import Figures
from flowplan.units import convert, significant

#: Readings with maps, those that exceed the plan most.
_MOST_MAPS = 8
#: A map is a square of this half size; its longest vector is as long as the pitch, or this.
_HALF = 100
_LONGEST = 22.0
#: Half the size of the field's box in a map.
_BOX = 80
#: The bar of what is planned, the same for all, and the longest bar of what is measured.
PLAN_LENGTH, BAR_WIDTH = 150, 240


@dataclass(frozen=True, slots=True)
class _Frame:
    """Half the size of a map [mm], whether it is a wafer's, and the drawing's units for 1 nm."""

    reach: tuple[float, float]
    round: bool
    stretch: float


@dataclass(frozen=True, slots=True)
class VectorMap:
    """Vectors at places; y points up in the data and down in the drawing.

    Attributes
    ----------
    title : str
        What is drawn.
    path : str
        A line for each vector, its foot a dot.
    feet : str
        The dots.
    frame_x, frame_y : float
        Half axes of the wafer's rim, or half the field's size.
    round : bool
        Whether the frame is the wafer's rim.
    words : str
        The longest vector in words.
    """

    title: str
    path: str
    feet: str
    frame_x: float
    frame_y: float
    round: bool
    words: str


@dataclass(frozen=True, slots=True)
class PlanBar:
    """Measured |mean| + 3 sigma against the plan, along one axis; the bar is measured over planned."""

    reading: str
    axis: str
    measured: str
    planned: str
    ratio: str
    measured_length: float
    exceeds: bool


@dataclass(frozen=True, slots=True)
class ReadingMaps:
    """The maps of one reading."""

    name: str
    maps: tuple[VectorMap, ...]


@dataclass(frozen=True, slots=True)
class MeasuredView:
    """Everything that the section shows."""

    file: str
    text: MeasuredText
    bars: tuple[PlanBar, ...]
    bar_width: int
    plan_length: int
    readings: tuple[ReadingMaps, ...]
    without_maps: int


def measured_view(taken: Taken) -> MeasuredView:
    """Return the view of measured overlay."""
    measured = taken.measured
    lengths = [f.three_sigma for r in measured.readings for f in r.axes.values()]
    figures = Figures.fitting(measured.flow.unit, lengths, digits=3)
    worst = sorted(measured.readings, key=_excess, reverse=True)[:_MOST_MAPS]
    shown = [reading for reading in measured.readings if reading in worst]
    return MeasuredView(
        taken.data.source.file.rsplit("/", 1)[-1],
        measured_text(taken),
        _bars(measured, figures),
        BAR_WIDTH,
        PLAN_LENGTH,
        tuple(_maps(measured, reading, figures) for reading in shown),
        len(measured.readings) - len(shown),
    )


def _excess(reading: MeasuredReading) -> float:
    ratios = [
        f.mean_plus_3sigma / f.plan.mean_plus_3sigma
        for f in reading.axes.values()
        if f.plan and f.plan.mean_plus_3sigma and math.isfinite(f.sigma)
    ]
    return max(ratios, default=0.0)


def _bars(measured: Measured, figures: Figures) -> tuple[PlanBar, ...]:
    both = [
        (reading, axis, of_axis, of_axis.plan)
        for reading in measured.readings
        for axis, of_axis in reading.axes.items()
        if of_axis.plan and math.isfinite(of_axis.sigma)
    ]
    return tuple(
        PlanBar(
            reading.name,
            axis,
            figures.text(f.mean_plus_3sigma),
            figures.text(p.mean_plus_3sigma),
            ratio_text(f),
            round(min(PLAN_LENGTH * f.mean_plus_3sigma / p.mean_plus_3sigma, BAR_WIDTH), 1),
            f.mean_plus_3sigma > p.mean_plus_3sigma,
        )
        for reading, axis, f, p in both
        if p and p.mean_plus_3sigma
    )


def _maps(measured: Measured, reading: MeasuredReading, figures: Figures) -> ReadingMaps:
    tally = reading.tally
    found: list[VectorMap] = []
    for where, cells in (("wafer", tally.wafer_map), ("field", tally.field_map)):
        places, mean, left = _vectors(cells, reading)
        if len(places) < 2:
            continue
        reach = _reach(measured, places, where)
        longest = max(float(np.hypot(*vectors.T).max()) for vectors in (mean, left))
        frame = _Frame(reach, where == "wafer", _LONGEST / longest if longest else 0.0)
        for title, vectors in (("mean", mean), ("left by the fit", left)):
            found.append(_map(f"{title} over the {where}", places, vectors, frame, figures))
    return ReadingMaps(reading.name, tuple(found))


def _vectors(cells: Cells, reading: MeasuredReading) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return place [mm], mean overlay and mean residual [nm] of each cell with rows, shape (n, 2)."""
    sums = cells.sums[cells.sums[:, 0] > 0]
    share = sums / sums[:, :1]
    basis, rest, places = share[:, :N_BASIS], share[:, N_BASIS : N_BASIS + 2], share[:, N_BASIS + 2 :]
    mean = rest + basis @ reading.tally.pattern
    return places, mean, mean - basis @ reading.fit.coefficients


def _reach(measured: Measured, places: FloatArray, where: str) -> tuple[float, float]:
    """Return half the size of what the map shows [mm]."""
    extent = [float(v) for v in np.abs(places).max(axis=0)]
    if where == "field":
        width, height = field_size(measured.flow)
        return max(extent[0], width / 2), max(extent[1], height / 2)
    radius = max(usable_radius(measured.flow) or 0.0, float(np.hypot(*places.T).max()))
    return radius, radius


def _map(
    title: str,
    places: FloatArray,
    vectors: FloatArray,
    frame: _Frame,
    figures: Figures,
) -> VectorMap:
    scale = ((_HALF - 4) if frame.round else _BOX) / max(*frame.reach, 1e-9)
    stretch = frame.stretch
    feet = np.round(places * (scale, -scale), 1) + 0.0
    tips = np.round(vectors * (stretch, -stretch), 1) + 0.0
    path = "".join(f"M{_n(x)} {_n(y)}l{_n(u)} {_n(v)}" for (x, y), (u, v) in zip(feet, tips, strict=True))
    dots = "".join(f"M{_n(x)} {_n(y)}h0" for x, y in feet)
    longest = convert(float(np.hypot(*vectors.T).max()), "nm", figures.unit)
    words = f"longest {significant(longest, 2):g} {figures.unit}"
    half = [round(reach * scale, 1) for reach in frame.reach]
    return VectorMap(title, path, dots, half[0], half[1], frame.round, words)


def _n(value: float) -> str:
    return f"{value:.1f}".removesuffix(".0")

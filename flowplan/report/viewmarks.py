"""Alignments from mark sites: how each grows from the centre to the edge, and what more marks would do."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.markoutlook import Growth, growth, outlook, sites_read
from flowplan.model.base import AXES, Axis
from flowplan.model.marksites import MarkSites
from flowplan.report.textchain import fitted_words
from flowplan.report.viewbase import Base, LayerName, plain
from flowplan.report.viewmasks import size_words

#: Points of a curve, and the drawing's size.
_POINTS = 25
_WIDTH, _HEIGHT = 420, 230
_LEFT, _RIGHT, _TOP, _BOTTOM = 62, 18, 20, 46
_STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)
#: Figures that differ by less than this share are the same.
_SAME = 1e-9
Read = tuple[LayerName, LayerName]


@dataclass(frozen=True, slots=True)
class Tick:
    """A labelled place on an axis of the drawing."""

    at: float
    text: str


@dataclass(frozen=True, slots=True)
class Curve:
    """The error along one axis, or along both where they are the same, as the path of a line."""

    axis: str
    path: str
    label_y: float


@dataclass(frozen=True, slots=True)
class Drawing:
    """How the error grows: distance to the right, error upwards."""

    width: int
    height: int
    left: int
    right: int
    top: int
    bottom: int
    curves: tuple[Curve, ...]
    across: tuple[Tick, ...]
    up: tuple[Tick, ...]


@dataclass(frozen=True, slots=True)
class CountRow:
    """One number of marks: the error at each place, per column."""

    marks: str
    cells: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class MarksView:
    """One alignment from mark sites.

    Attributes
    ----------
    heading, per_mark : str
        What is fitted to how many marks, and how well one is read.
    fitted : str
        Errors of what is fitted.
    reads : tuple of (LayerName, LayerName)
        Who reads whose marks so.
    columns : tuple of str
        Places at which the table tells the error.
    figures : str
        What a cell holds, where x and y differ.
    drawing : Drawing
        The curve.
    rows : tuple of CountRow
        As planned, then other numbers of marks.
    ring : str
        Radius of their ring [mm].
    """

    heading: str
    per_mark: str
    fitted: str
    reads: tuple[Read, ...]
    columns: tuple[str, ...]
    figures: str
    drawing: Drawing
    rows: tuple[CountRow, ...]
    ring: str


def marks_view(base: Base) -> tuple[MarksView, ...]:
    """Return every alignment from mark sites that a mask of the plan uses, in process order."""
    flow = base.result.flow
    found: dict[MarkSites, dict[Read, None]] = {}
    for mask in flow.masks:
        for axis in AXES:
            for reading in mask.aligns_to.on(axis):
                sites = sites_read(flow, mask.id, reading.mask, axis)
                if sites is not None:
                    read = base.names[mask.id], base.names[reading.mask]
                    found.setdefault(sites, {})[read] = None
    return tuple(_view(base, sites, tuple(reads)) for sites, reads in found.items())


def _view(base: Base, sites: MarkSites, reads: tuple[Read, ...]) -> MarksView:
    flow = base.result.flow
    ahead = outlook(flow, sites)
    fine = growth(flow, sites, np.linspace(0, 1, _POINTS).tolist())
    every = [ahead.planned, *(grown for _, grown in ahead.tried)]
    axes: tuple[Axis, ...] = ("x",) if all(map(_alike, every)) else AXES
    places = [f"{d:.4g} mm" for d in ahead.planned.distances.tolist()]
    edge = "edge" if sites.over == "wafer" else "corner"
    stops = ("centre", places[1], f"{edge}, {places[2]}")
    counts = [(f"{sites.count}, as planned", ahead.planned)]
    counts += [(str(count), grown) for count, grown in ahead.tried]
    return MarksView(
        heading=str(sites)[0].upper() + str(sites)[1:],
        per_mark=size_words(base, sites.per_mark),
        fitted=fitted_words(ahead, flow, base.length),
        reads=reads,
        columns=stops,
        figures="" if len(axes) == 1 else "; along x / along y",
        drawing=_drawing(base, fine, axes),
        rows=tuple(CountRow(words, _cells(base, grown, axes)) for words, grown in counts),
        ring=f"{ahead.radius:.4g}",
    )


def _alike(grown: Growth) -> bool:
    return np.allclose(grown.sigma["x"], grown.sigma["y"], rtol=_SAME, atol=0)


def _cells(base: Base, grown: Growth, axes: Sequence[Axis]) -> tuple[str, ...]:
    confidence = base.result.flow.confidence
    figures = ([base.length(confidence * s) for s in grown.sigma[axis].tolist()] for axis in axes)
    return tuple(" / ".join(place) for place in zip(*figures, strict=True))


def _drawing(base: Base, grown: Growth, axes: Sequence[Axis]) -> Drawing:
    confidence = base.result.flow.confidence
    errors = {axis: confidence * grown.sigma[axis] for axis in axes}
    top = max(float(e.max()) for e in errors.values()) or 1.0
    far = float(grown.distances[-1]) or 1.0
    wide, high = _WIDTH - _LEFT - _RIGHT, _HEIGHT - _TOP - _BOTTOM

    def over(distance: float) -> float:
        return _LEFT + wide * distance / far

    def above(error: float) -> float:
        return _TOP + high * (1 - error / top)

    curves = []
    for axis, error in errors.items():
        points = zip(grown.distances.tolist(), error.tolist(), strict=True)
        path = "M" + "L".join(f"{over(d):.1f} {above(e):.1f}" for d, e in points)
        label = "x and y" if len(axes) == 1 else axis
        curves.append(Curve(label, path, round(above(float(error[-1])) - 6, 1)))
    across = tuple(Tick(round(over(v), 1), plain(v)) for v in ticks(far))
    up = tuple(Tick(round(above(v), 1), base.length(v)) for v in ticks(top))
    return Drawing(
        _WIDTH,
        _HEIGHT,
        _LEFT,
        _WIDTH - _RIGHT,
        _TOP,
        _HEIGHT - _BOTTOM,
        tuple(curves),
        tuple(across),
        tuple(up),
    )


def ticks(top: float) -> list[float]:
    """Return round values from 0 to a largest value above 0, at most six."""
    power = 10.0 ** np.floor(np.log10(top / 5))
    step = next(s * power for s in _STEPS if s * power * 5 >= top * (1 - _SAME))
    return [round(i * step, 12) for i in range(6) if i * step <= top * (1 + _SAME)]

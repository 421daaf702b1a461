"""A simulation in the report: yield figures, histograms of residuals, and the map of good fields."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.simulate import PairOutcome, Simulation
from flowplan.engine.simulate.tally import Histogram
from flowplan.engine.sources import FloatArray
from flowplan.model.flow import Flow
from flowplan.report.charts import Squares, squares
from flowplan.report.simulation import (
    SimulationText,
    likeliest,
    ppm,
    several,
    share_text,
    simulation_text,
    title_of,
)
from flowplan.report.textfigures import Figures
from flowplan.report.viewmap import MapFrame, frame_of, levels, places_of

#: Pairs with a histogram, and pairs with a row.
_CHARTS, _ROWS = 6, 20
#: Bars of a histogram, and its size in the drawing's units.
_BARS = 48
HEIGHT, BAR = 60, 5
WIDTH = (_BARS + 1) * BAR
#: What lies beyond this share of the samples on either side is not drawn.
_BEYOND = 1e-4


@dataclass(frozen=True, slots=True)
class HistogramView:
    """The histogram of one residual against its room.

    Attributes
    ----------
    title, axis : str
        Whose.
    holding, failing : str
        Paths of the bars above and below what must be kept.
    keep : int
        Where what must be kept stands.
    low, high, kept : str
        The ends and what must be kept, in words.
    words : str
        What the drawing shows.
    """

    title: str
    axis: str
    holding: str
    failing: str
    keep: int
    low: str
    high: str
    kept: str
    words: str


@dataclass(frozen=True, slots=True)
class GoodFields:
    """The fields that hold.

    Attributes
    ----------
    frame, squares
        The wafer map: the larger the square, the fewer wafers hold there.
    words : str
        What the map shows.
    bars : str
        Path of a histogram of the good fields of a wafer.
    low, high : str
        Its ends.
    wafers : str
        What it shows.
    """

    frame: MapFrame
    squares: tuple[Squares, ...]
    words: str
    bars: str
    low: str
    high: str
    wafers: str


@dataclass(frozen=True, slots=True)
class SimulationView:
    """Everything that the section shows."""

    text: SimulationText
    unit: str
    charts: tuple[HistogramView, ...]
    chart_width: int
    chart_height: int
    fields: GoodFields | None


def simulation_view(found: Simulation) -> SimulationView:
    """Return the view of a simulation."""
    split = several(found.pairs)
    varying = [outcome for outcome in likeliest(found.pairs) if outcome.histogram.width > 0]
    charts = tuple(
        _chart(outcome, title_of(outcome, split), found.flow.unit) for outcome in varying[:_CHARTS]
    )
    text = simulation_text(found, _ROWS)
    return SimulationView(text, found.flow.unit, charts, WIDTH, HEIGHT, _good_fields(found))


def _chart(outcome: PairOutcome, title: str, unit: str) -> HistogramView:
    keep = outcome.entry.keep
    low, width, counts = _bars(outcome.histogram, keep)
    split = round((keep - low) / width)
    bars = _paths(counts)
    figures = Figures.fitting(unit, (low, low + width * len(bars)))
    middle = figures.text(outcome.histogram.quantile(0.5))
    return HistogramView(
        title=title,
        axis=outcome.entry.axis,
        holding="".join(bars[max(0, split) :]),
        failing="".join(bars[: max(0, split)]),
        keep=split * BAR,
        low=figures.text(low),
        high=figures.text(low + width * len(bars)),
        kept=figures.text(keep),
        words=f"median {middle}, {figures.text(keep)} must remain, {ppm(outcome.rare.fail)} ppm fail",
    )


def _paths(counts: FloatArray) -> list[str]:
    """Return one stroke a bar, the highest as high as the drawing; what is there has at least one step."""
    heights = np.where(counts > 0, np.maximum(1, np.rint(counts / counts.max() * (HEIGHT - 4))), 0)
    return [f"M{i * BAR + 2} {HEIGHT}v-{h}" if h else "" for i, h in enumerate(heights.astype(int))]


def _bars(histogram: Histogram, keep: float) -> tuple[float, float, FloatArray]:
    """Return where bars begin, how wide they are, and their counts; what must be kept is on an edge."""
    low = min(histogram.quantile(_BEYOND), keep)
    high = max(histogram.quantile(1 - _BEYOND), keep)
    width = (high - low) / (_BARS - 1)
    low = keep - np.ceil((keep - low) / width) * width
    edges = histogram.low + histogram.width * np.arange(len(histogram.counts) + 1)
    below = np.concatenate([[0], np.cumsum(histogram.counts)]).astype(np.float64)
    at = np.interp(low + width * np.arange(_BARS + 1), edges, below)
    return float(low), float(width), np.diff(at)


def _good_fields(found: Simulation) -> GoodFields | None:
    fields = found.fields
    if len(fields.centres) == 1:
        return None
    flow: Flow = found.flow
    frame = frame_of(flow, fields.centres)
    places, block_of = places_of(fields.centres, frame)
    good = np.full(len(places), np.inf)
    np.minimum.at(good, block_of, fields.good)
    one = "square" if frame.block > 1 else "field"
    lowest, highest = share_text(float(good.min())), share_text(float(good.max()))
    words = f"a {one} holds on {lowest} to {highest} of {fields.per_wafer.size} simulated wafers"
    least, total = int(fields.per_wafer.min()), len(fields.centres)
    step = -(-(total - least + 1) // _BARS)
    least = total + 1 - step * _BARS
    counts = np.bincount((fields.per_wafer.reshape(-1) - least) // step, minlength=_BARS)
    return GoodFields(
        frame,
        squares(places, levels(good).tolist()),
        words,
        bars="".join(_paths(counts.astype(np.float64))),
        low=str(max(0, least)),
        high=str(total),
        wafers=f"{fields.per_wafer.size} simulated wafers by how many of their fields hold",
    )

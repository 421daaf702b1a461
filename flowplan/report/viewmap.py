"""The small map of a margin: by field on the wafer, or by site where every field is the same."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.parts import CHUNK
from flowplan.engine.results import Entry
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import AXES
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, usable_radius
from flowplan.report.charts import Squares, runs, squares
from flowplan.report.viewbase import Base
from flowplan.units import convert

#: Classes of a map, the smallest margin in the first.
LEVELS = 5
#: Fields are joined to blocks beyond this many in a row.
_MOST_COLUMNS = 41
#: Margins over a map that differ by less than this share are the same.
_FLAT = 1e-9


@dataclass(frozen=True, slots=True)
class MapFrame:
    """What all wafer maps of a report share; lengths in squares unless said otherwise.

    Attributes
    ----------
    width, height : float
        Size of one square [mm].
    block : int
        Fields joined along each axis in one square.
    view_box : str
        What a map shows; x and y have scales of their own, so that a square has unit size.
    rim_x, rim_y, usable_x, usable_y : float
        Half axes of the wafer's and the usable rim.
    """

    width: float
    height: float
    block: int
    view_box: str
    rim_x: float
    rim_y: float
    usable_x: float
    usable_y: float

    @classmethod
    def of(cls, radius: float, usable: float, pitch: tuple[float, float], block: int) -> "MapFrame":
        """Return the frame of a wafer [mm] with fields of a pitch [mm], joined to blocks."""
        width, height = pitch[0] * block, pitch[1] * block
        x, y = round(radius / width, 2), round(radius / height, 2)
        box = " ".join(f"{v:.4g}" for v in (-x - 0.1, -y - 0.1, 2 * x + 0.2, 2 * y + 0.2))
        return cls(width, height, block, box, x, y, round(usable / width, 2), round(usable / height, 2))


@dataclass(frozen=True, slots=True)
class MapView:
    """One map.

    Attributes
    ----------
    kind : {'wafer', 'field'}
        Squares are fields on the wafer, or sites in a field.
    squares : tuple of Squares
        By class.
    failing : str
        Path over the places where the margin is below 0; may be empty.
    words : str
        What the map shows, in words.
    """

    kind: str
    squares: tuple[Squares, ...]
    failing: str
    words: str


def map_frame(base: Base) -> MapFrame | None:
    """Return what the maps share; None where nothing depends on position."""
    sites = base.result.engine.sites
    return None if sites.n_points == 1 else frame_of(base.result.flow, sites.centres)


def frame_of(flow: Flow, centres: FloatArray) -> MapFrame:
    """Return the frame of a flow's wafer with fields at these centres [mm]."""
    pitch, radius = field_size(flow), usable_radius(flow)
    if flow.wafer is None or radius is None:
        return MapFrame.of(0.0, 0.0, pitch, 1)
    block = math.ceil(len(np.unique(centres[:, 0])) / _MOST_COLUMNS)
    full = convert(flow.wafer.diameter.in_base(flow.unit) / 2, "nm", "mm")
    return MapFrame.of(full, radius, pitch, block)


def places_of(centres: FloatArray, frame: MapFrame) -> tuple[list[tuple[int, int]], IntArray]:
    """Return the grid places of the squares, (column, row downwards), and the square of each field."""
    grid = np.rint(centres / (frame.width, frame.height)).astype(np.int64)
    places, block_of = np.unique(grid[:, ::-1], axis=0, return_inverse=True)
    return [(int(column), -int(row)) for row, column in places], block_of.reshape(-1)


def maps_of(base: Base, frame: MapFrame | None) -> dict[int, MapView]:
    """Return the map of every entry whose margin depends on position, by the entry's place."""
    if frame is None:
        return {}
    found: dict[int, MapView] = {}
    painter = _Painter(base, frame)
    for axis in AXES:
        chosen = [(i, e) for i, e in enumerate(base.result.entries) if e.axis == axis and e.point]
        for part in _chunks(chosen, base.result.engine.sites.n_points):
            margins = base.result.engine.margin_map([entry for _, entry in part])
            found.update((i, painter.paint(row)) for (i, _), row in zip(part, margins, strict=True))
    return found


def _chunks(chosen: list[tuple[int, Entry]], n_points: int) -> Iterator[list[tuple[int, Entry]]]:
    step = max(1, CHUNK // n_points)
    return (chosen[i : i + step] for i in range(0, len(chosen), step))


class _Painter:
    """Turns margins over all sites into classes of fields."""

    def __init__(self, base: Base, frame: MapFrame) -> None:
        sites = base.result.engine.sites
        self._base, self._n_fields = base, sites.n_fields
        self._places, self._block_of = places_of(sites.centres, frame)
        self._joined = frame.block > 1

    def paint(self, margins: FloatArray) -> MapView:
        by_field = margins.reshape(self._n_fields, -1)
        fields = by_field.min(axis=1)
        if self._n_fields > 1 and np.ptp(fields) > _FLAT * float(np.abs(margins).max()):
            blocks = np.full(len(self._places), np.inf)
            np.minimum.at(blocks, self._block_of, fields)
            return self._map("wafer", self._places, blocks, "square" if self._joined else "field")
        places = [(column, -row) for row in (-1, 0, 1) for column in (-1, 0, 1)]
        return self._map("field", places, by_field.min(axis=0), "site")

    def _map(self, kind: str, places: Sequence[tuple[int, int]], margins: FloatArray, one: str) -> MapView:
        base = self._base
        low, high = float(margins.min()), float(margins.max())
        failing = [place for place, margin in zip(places, margins, strict=True) if margin < 0]
        words = f"{base.signed(low)} to {base.signed(high)} by {one}"
        if failing and base.result.flow.pairs:
            words += f"; below 0 in {len(failing)} of {len(places)}"
        crosses = runs(failing)
        return MapView(kind, squares(places, levels(margins).tolist()), crosses, words)


def levels(margins: FloatArray) -> IntArray:
    """Return each margin's class, 0 for the smallest fifth of the range."""
    low, high = float(margins.min()), float(margins.max())
    if high == low:
        return np.full(len(margins), LEVELS - 1, dtype=np.int64)
    return np.minimum(((margins - low) / (high - low) * LEVELS).astype(np.int64), LEVELS - 1)

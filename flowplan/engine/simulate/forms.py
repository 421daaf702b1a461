"""The judged pairs as linear forms of the sources, at places of the field.

A pair on one axis has the overlay e and the sum of edges E. What is left of the drawn dimension
beyond what must be kept is, on the two sides, ``room + E + e`` and ``room + E - e``; the worse is

    room + E - |e|        room = drawn - keep + the edges' known offset - the bounds at their worst sign

e is affine in position, so over a field it is largest at a corner.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine, Result
from flowplan.engine.margin import DUST, settle
from flowplan.engine.parts import Kernel
from flowplan.engine.points import basis_at
from flowplan.engine.residual import Residuals, Row, residuals
from flowplan.engine.results import Entry
from flowplan.engine.sources import N_BASIS, FloatArray, IntArray
from flowplan.model.base import AXES, Axis

_ORIGIN = (0.0, 0.0, 0.0, 0.0)


@dataclass(frozen=True, slots=True)
class AxisRows:
    """The judged rows of one axis."""

    entries: tuple[Entry, ...]
    residuals: Residuals
    kernel: Kernel
    n_sources: int

    def by_source(self, amounts: FloatArray) -> FloatArray:
        """Spread amounts of the axis's active sources over all sources."""
        found = np.zeros((len(amounts), self.n_sources))
        found[:, self.kernel.table.active] = amounts
        return found

    def overlay_at(self, basis: FloatArray) -> FloatArray:
        """Return e by source, each row at a point of its own, shape (n_rows, n_sources)."""
        return self.by_source(self.kernel.at_points(self.residuals.overlay, basis))

    def edges(self) -> FloatArray:
        """Return E by source, shape (n_rows, n_sources)."""
        return self.by_source(self.kernel.by_source(self.residuals.edges))


def judged_entries(result: Result) -> tuple[Entry, ...]:
    """Return the entries that something is judged by, those along x first."""
    return tuple(e for axis in AXES for e in result.entries if e.axis == axis and e.margin is not None)


def axis_rows(engine: Engine, entries: Sequence[Entry]) -> list[AxisRows]:
    """Return entries by axis, in their order."""
    return [_axis_rows(engine, tuple(e for e in entries if e.axis == axis), axis) for axis in AXES]


def _axis_rows(engine: Engine, entries: tuple[Entry, ...], axis: Axis) -> AxisRows:
    rows = tuple(Row(e.pair, *e.layers, e.axis) for e in entries)
    kernel = engine.view(axis).kernel
    res = residuals(engine.flow, engine.placement, rows, axis)
    return AxisRows(entries, res, kernel, len(engine.placement.sources))


@dataclass(frozen=True, slots=True)
class PairForms:
    """The judged rows at their worst points.

    Attributes
    ----------
    overlay, edges : ndarray, shape (n_rows, n_sources)
        e and E by source, at the quoted sizes [nm].
    offset, room : ndarray, shape (n_rows,)
        The known part of e, and the room [nm].
    along_x : int
        How many of the rows, the first ones, lie along x.
    """

    overlay: FloatArray
    edges: FloatArray
    offset: FloatArray
    room: FloatArray
    along_x: int

    @property
    def axes(self) -> tuple[slice, slice]:
        """The rows of each axis, which have few sources in common."""
        return slice(0, self.along_x), slice(self.along_x, len(self.room))


def pair_forms(result: Result, entries: Sequence[Entry], *, bounds_vary: bool) -> PairForms:
    """Return the judged rows, each at the worst point that its margin was taken at.

    Parameters
    ----------
    result : Result
        The analysis.
    entries : sequence of Entry
        As `judged_entries` returns them.
    bounds_vary : bool
        Whether bounds are drawn; else the room is less by their sum.
    """
    parts = []
    for rows in axis_rows(result.engine, entries):
        basis = basis_at(np.array([_place(e) for e in rows.entries]).reshape(-1, 4))
        overlay, edges = rows.overlay_at(basis), rows.edges()
        is_offset, is_bound = (np.zeros(rows.n_sources) for _ in range(2))
        is_offset[rows.kernel.table.active] = rows.kernel.offset[rows.kernel.table.starts]
        is_bound[rows.kernel.table.active] = rows.kernel.bound[rows.kernel.table.starts]
        bound = np.abs(overlay + edges) @ is_bound * (not bounds_vary)
        res = rows.residuals
        room = res.drawn + edges @ is_offset - res.keep - bound
        offset = overlay @ is_offset
        for i in range(len(room)):  # what is exactly nothing must not fail by its rounding
            terms = float(res.drawn[i]), float(res.keep[i]), float(bound[i])
            room[i] = abs(offset[i]) + settle(float(room[i] - abs(offset[i])), *terms)
        parts.append((overlay, edges, offset, room))
    overlay, edges, offset, room = (np.concatenate(part) for part in zip(*parts, strict=True))
    return PairForms(overlay, edges, offset, room, len(parts[0][0]))


def _place(entry: Entry) -> tuple[float, float, float, float]:
    point = entry.point
    return _ORIGIN if point is None else (point.X, point.Y, point.x, point.y)


@dataclass(frozen=True, slots=True)
class FieldForms:
    """The judged rows as functions of position.

    Layers are kept rather than rows: they are fewer, and a row is the difference of two. A place is a
    layer on one axis.

    Attributes
    ----------
    pattern : ndarray, shape (n_basis, n_places, n_sources)
        D by basis function of position and source, at the quoted sizes [nm, or nm per mm].
    edge : ndarray, shape (n_places, n_sources)
        Edge errors by source [nm].
    first, second : ndarray of int, shape (n_rows,)
        The places of each row's layers.
    signs : ndarray, shape (n_rows, 2)
        Signs of their edges in E.
    offset : ndarray, shape (n_basis, n_rows)
        The known part of e by basis function [nm, or nm per mm].
    room : ndarray, shape (n_rows,)
        The room without bounds [nm].
    bound : callable
        Takes basis functions, shape (n_basis, n_points), and returns the bounds' sum at each row and
        point, shape (n_rows, n_points) [nm].
    """

    pattern: FloatArray
    edge: FloatArray
    first: IntArray
    second: IntArray
    signs: FloatArray
    offset: FloatArray
    room: FloatArray
    bound: Callable[[FloatArray], FloatArray]

    def rows_overlay(self, places: FloatArray) -> FloatArray:
        """Return what rows have of what places have, as e has it of D."""
        return np.asarray(places[self.second] - places[self.first])

    def rows_edges(self, places: FloatArray) -> FloatArray:
        """Return what rows have of what places have, as E has it of the edges."""
        return np.asarray(self.signs[:, :1] * places[self.first] + self.signs[:, 1:] * places[self.second])


def field_forms(engine: Engine, entries: Sequence[Entry], *, bounds_vary: bool) -> FieldForms:
    """Return the judged rows as functions of position; arguments as for `pair_forms`."""
    parts = axis_rows(engine, entries)
    placement, n_layers = engine.placement, len(engine.placement.index)
    start = {axis: i * n_layers for i, axis in enumerate(AXES)}
    pattern = [_by_basis(rows, placement.pattern[axis]) for rows, axis in zip(parts, AXES, strict=True)]
    edge = [
        rows.by_source(rows.kernel.by_source(placement.edge[axis]))
        for rows, axis in zip(parts, AXES, strict=True)
    ]
    layers = np.array([[start[e.axis] + placement.index[name] for name in e.layers] for e in entries])

    def bound(basis: FloatArray) -> FloatArray:
        if bounds_vary:
            return np.zeros((len(entries), basis.shape[1]))
        both = (r.residuals.overlay + r.residuals.edges for r in parts)
        sums = (r.kernel.absolute_sum(b, r.kernel.bound, basis) for r, b in zip(parts, both, strict=True))
        return np.concatenate(list(sums))

    return FieldForms(
        pattern=np.concatenate(pattern, axis=1),
        edge=np.concatenate(edge),
        first=layers[:, 0],
        second=layers[:, 1],
        signs=np.array([e.pair.edge_signs for e in entries], dtype=np.float64),
        offset=np.concatenate([r.kernel.offset_form(r.residuals.overlay) for r in parts]).T,
        room=np.concatenate([_field_room(r) for r in parts]),
        bound=bound,
    )


def _by_basis(rows: AxisRows, amounts: FloatArray) -> FloatArray:
    """Return amounts over modes by basis function and source."""
    found = []
    for index in range(N_BASIS):
        chosen = np.zeros((N_BASIS, len(amounts)))
        chosen[index] = 1.0
        found.append(rows.by_source(rows.kernel.at_points(amounts, chosen)))
    return np.stack(found)


def _field_room(rows: AxisRows) -> FloatArray:
    """Return the room without bounds; what is exactly nothing must not fail by its rounding."""
    res = rows.residuals
    dust = DUST * (np.abs(res.drawn) + np.abs(res.keep))
    return np.asarray(res.drawn - res.keep + res.edges @ rows.kernel.offset + dust)

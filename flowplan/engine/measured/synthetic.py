"""Measured overlay as a flow's own sources would make it, drawn wafer by wafer."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.points import basis_at
from flowplan.engine.sources import N_BASIS, FloatArray, Source
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, whole_fields

#: Measured sites of a field, as fractions of half its size: corners, edge middles and centre.
_SITES = np.array([(u, v) for v in (-1.0, 0.0, 1.0) for u in (-1.0, 0.0, 1.0)])


@dataclass(frozen=True, slots=True)
class WaferRows:
    """One reading on one wafer.

    Attributes
    ----------
    mask, reference : str
        The layers.
    lot, wafer : int
        Counted from 1; the wafer within its lot.
    positions : ndarray, shape (n_rows, 4)
        X, Y, x, y [mm].
    overlay : ndarray, shape (n_rows, 2)
        Mask minus reference [nm].
    """

    mask: str
    reference: str
    lot: int
    wafer: int
    positions: FloatArray
    overlay: FloatArray


def readings_of(flow: Flow) -> tuple[tuple[str, str], ...]:
    """Return each mask with each layer that it reads, in process order; not the bare wafer."""
    pairs = [
        (mask.id, reading.mask)
        for mask in flow.masks
        for axis in AXES
        for reading in mask.aligns_to.on(axis)
        if reading.mask != WAFER
    ]
    return tuple(dict.fromkeys(pairs))


def places_of(flow: Flow) -> FloatArray:
    """Return the measured places of a wafer, shape (n_fields, n_sites, 4): X, Y, x, y [mm]."""
    width, height = field_size(flow)
    centres = np.array(whole_fields(flow), dtype=np.float64).reshape(-1, 2)
    sites = _SITES * (width / 2, height / 2) if width and height else np.zeros((1, 2))
    shape = (len(centres), len(sites), 2)
    return np.concatenate(
        [np.broadcast_to(centres[:, None], shape), np.broadcast_to(sites[None], shape)], axis=2
    )


def synthetic(engine: Engine, seed: int, lots: int, wafers: int) -> Iterator[WaferRows]:
    """Draw measured overlay of every reading of a flow.

    Parameters
    ----------
    engine : Engine
        A placed flow.
    seed : int
        The same seed gives the same rows.
    lots, wafers : int
        How many lots, and wafers in each.

    Yields
    ------
    WaferRows
        One for each wafer and reading. A source is drawn as often as it varies; a bound stands at one
        of its two ends on all wafers; an offset is always there. The metrology itself adds nothing.
    """
    rng = np.random.default_rng(seed)
    places = places_of(engine.flow)
    basis = basis_at(places.reshape(-1, 4)).reshape(N_BASIS, *places.shape[:2])
    pairs = readings_of(engine.flow)
    rows = {axis: _overlays(engine, pairs, axis) for axis in AXES}
    sources = engine.placement.sources
    scalars = np.ones((len(sources), len(places)))
    by_level = {
        level: [i for i, s in enumerate(sources) if _level(s) == level]
        for level in ("mask", "lot", "wafer", "field")
    }
    _redraw(scalars, by_level["mask"], engine, rng)
    for lot in range(1, lots + 1):
        _redraw(scalars, by_level["lot"], engine, rng)
        for wafer in range(1, wafers + 1):
            _redraw(scalars, by_level["wafer"], engine, rng)
            _redraw(scalars, by_level["field"], engine, rng, each_field=True)
            moved = {axis: _moved(engine, axis, rows[axis], scalars, basis) for axis in AXES}
            for number, (mask, reference) in enumerate(pairs):
                overlay = np.stack([moved[axis][number].reshape(-1) for axis in AXES], axis=1)
                yield WaferRows(mask, reference, lot, wafer, places.reshape(-1, 4), overlay)


def _overlays(engine: Engine, pairs: tuple[tuple[str, str], ...], axis: Axis) -> FloatArray:
    index = engine.placement.index
    return engine.placement.overlay(axis, [index[r] for _, r in pairs], [index[m] for m, _ in pairs])


def _level(source: Source) -> str:
    return "offset" if source.kind == "offset" else source.varies


def _redraw(
    scalars: FloatArray,
    chosen: list[int],
    engine: Engine,
    rng: np.random.Generator,
    *,
    each_field: bool = False,
) -> None:
    """Draw some scalars afresh, in units of their quoted sizes."""
    n_fields = scalars.shape[1] if each_field else 1
    for i in chosen:
        kind = engine.placement.sources[i].kind
        if kind == "random":
            scalars[i] = rng.standard_normal(n_fields) / engine.flow.sigma
        elif kind == "uniform":
            scalars[i] = rng.uniform(-1.0, 1.0, n_fields)
        else:
            scalars[i] = rng.choice((-1.0, 1.0))


def _moved(
    engine: Engine, axis: Axis, rows: FloatArray, scalars: FloatArray, basis: FloatArray
) -> FloatArray:
    """Return the overlay of each reading at every place, shape (n_readings, n_fields, n_sites) [nm]."""
    table = engine.placement.modes[axis]
    total = np.zeros((len(rows), *basis.shape[1:]))
    for b in range(N_BASIS):
        modes = np.flatnonzero(table.basis == b)
        by_field = rows[:, modes] @ scalars[table.source[modes]]
        total += by_field[:, :, None] * basis[b]
    return total

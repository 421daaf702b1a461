"""Pairs as rows of residuals: how far the drawn dimension is eaten up, per axis, in coefficients.

For a pair with the overlay e = D_second - D_first and the edges E of its two layers

    enclosure  d ± e + E_outer - E_inner        extension  d ± e + E_of - E_past
    spacing    d ± e - E_1 - E_2                overlap    d ± e + E_1 + E_2
    overlay    limit ± e

The sign of e stands for the two sides. Edge errors and placements never share a source, so the
random and bounded parts are the same on both sides; only the offset tells them apart.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from flowplan.engine.placement import Placement
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import Axis
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing
from flowplan.model.pairs import AnyPair, AxisPair, Overlay


@dataclass(frozen=True, slots=True)
class Row:
    """One pair of layers on one axis.

    Attributes
    ----------
    pair : AxisPair
        The pair in the flow.
    first, second : str
        The two layers, split layers already expanded.
    axis : {'x', 'y'}
        The axis.
    """

    pair: AxisPair
    first: str
    second: str
    axis: Axis


@dataclass(frozen=True, slots=True)
class Residuals:
    """Rows of one axis as arrays.

    Attributes
    ----------
    rows : tuple of Row
        What each row is.
    overlay, edges : ndarray, shape (n_rows, n_modes)
        Amounts in e and in the sum of edges [nm, or nm per mm].
    drawn, keep : ndarray, shape (n_rows,)
        Drawn dimension (or limit) and what must remain [nm]; drawn is NaN where nothing is judged.
    """

    rows: tuple[Row, ...]
    overlay: FloatArray
    edges: FloatArray
    drawn: FloatArray
    keep: FloatArray


def rows_of(flow: Flow, pairs: Iterable[AnyPair]) -> tuple[Row, ...]:
    """Return one row per pair, layers of a split layer and axis, in file order; none for a landing."""
    return tuple(
        Row(pair, first, second, axis)
        for pair in pairs
        if not isinstance(pair, Landing)
        for first in flow.expand(pair.layers[0])
        for second in flow.expand(pair.layers[1])
        for axis in pair.judged_axes
    )


def residuals(
    flow: Flow, placement: Placement, rows: tuple[Row, ...], axis: Axis, modes: IntArray | None = None
) -> Residuals:
    """Return the residuals of rows that lie on one axis.

    Parameters
    ----------
    flow : Flow
        Gives the file's unit.
    placement : Placement
        Every layer's place.
    rows : tuple of Row
        Rows on `axis`.
    axis : {'x', 'y'}
        The axis.
    modes : ndarray of int, optional
        Only these modes.
    """
    first = [placement.index[row.first] for row in rows]
    second = [placement.index[row.second] for row in rows]
    signs = np.array([row.pair.edge_signs for row in rows], dtype=np.float64).reshape(-1, 2)
    edge = placement.edge[axis] if modes is None else placement.edge[axis][:, modes]
    edges = signs[:, :1] * edge[first] + signs[:, 1:] * edge[second]
    drawn, keep = zip(*(drawn_and_keep(flow, row) for row in rows), strict=True) if rows else ((), ())
    return Residuals(
        rows,
        placement.overlay(axis, first, second, modes),
        edges,
        np.array(drawn, dtype=np.float64),
        np.array(keep, dtype=np.float64),
    )


def drawn_and_keep(flow: Flow, row: Row) -> tuple[float, float]:
    """Return a row's drawn dimension or limit, NaN for none, and what must remain [nm]."""
    pair = row.pair
    if isinstance(pair, Overlay):
        limit = np.nan if pair.limit is None else pair.limit.on(row.axis).in_base(flow.unit)
        return limit, 0.0
    return pair.drawn.on(row.axis).in_base(flow.unit), pair.keep.on(row.axis).in_base(flow.unit)

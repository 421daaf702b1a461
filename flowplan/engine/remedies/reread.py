"""What other references of one mask do to every margin, without placing the flow again.

Reading other marks moves the printed frame of the mask by one vector over the sources, and everything
that inherits from the mask moves along by its share. So a candidate costs only the rows that it moves.
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from flowplan.engine.board import Board
from flowplan.engine.margin import select
from flowplan.engine.parts import CHUNK, Kernel
from flowplan.engine.placement import Amounts, Placement, assemble, walked
from flowplan.engine.residual import Residuals
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.edits import Readings
from flowplan.model.flow import Flow
from flowplan.model.masks import Reading, References, SelfAligned

#: What a mask may read instead, by mask and axis.
Options = Mapping[tuple[str, Axis], tuple[Readings, ...]]
#: A share of a mask's move below this is the rounding of averaged weights.
_NOTHING = 1e-12


@dataclass(frozen=True, slots=True)
class Moved:
    """The margins that other references of one mask on one axis move.

    Attributes
    ----------
    rows : ndarray of int, shape (n_rows,)
        Which rows of the board.
    margins : ndarray, shape (n_options, n_rows)
        Their margins with each option [nm].
    """

    rows: IntArray
    margins: FloatArray


class RereadSpace:
    """A flow placed together with everything that its masks might read instead.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    options : mapping of (mask id, axis) to tuple of Readings
        What each mask might read along an axis.
    """

    def __init__(self, flow: Flow, options: Options) -> None:
        self.flow, self.options = flow, options
        self.walk = walked(flow)
        self._reads: dict[tuple[str, Axis, str, object], Amounts] = {}
        for (mask, axis), choices in options.items():
            for reading in (r for readings in choices for r in readings):
                self._read(mask, axis, reading)
        self.placement: Placement = assemble(flow, self.walk)
        _, self._columns = self.walk.book.tables()
        self.board = Board.of(flow)
        self._share = {axis: shares(flow, axis) for axis in AXES}
        self._kernel = {
            axis: Kernel.of(self.placement.modes[axis], self.placement.sources, flow.sigma) for axis in AXES
        }
        self._res = {axis: self.board.residuals(self.placement, axis) for axis in AXES}
        self.margins = self.board.margins(self.placement)

    def moved(self, mask: str, axis: Axis) -> Moved:
        """Return what the options of a mask on an axis do."""
        share, index = self._share[axis], self.placement.index
        rows = [self.board.rows[i] for i in self.board.places[axis]]
        first = np.array([index[row.first] for row in rows], dtype=np.int64)
        second = np.array([index[row.second] for row in rows], dtype=np.int64)
        inherited = share[:, index[mask]]
        part = np.flatnonzero(np.abs(inherited[second] - inherited[first]) > _NOTHING)
        base = select(self._res[axis], part)
        shifts = np.array([self._shift(mask, axis, option) for option in self.options[mask, axis]])
        if not len(part):
            return Moved(part, np.zeros((len(shifts), 0)))
        found = [np.zeros((0, len(part)))]
        step = max(1, CHUNK // base.overlay.size)
        for i in range(0, len(shifts), step):
            some = shifts[i : i + step]
            used = np.flatnonzero(some.any(axis=0) | base.overlay.any(axis=0) | base.edges.any(axis=0))
            a, b = (
                self.placement.pattern[axis][np.ix_(at[part], used)]
                + inherited[at[part]][None, :, None] * some[:, None, used]
                for at in (first, second)
            )
            kernel = self._kernel[axis].narrowed(used)
            found.append(self.board.worst_margins(_replaced(base, used, a, b), kernel).reshape(-1, len(part)))
        return Moved(self.board.places[axis][part], np.concatenate(found))

    def _shift(self, mask: str, axis: Axis, readings: Readings) -> FloatArray:
        """Return how the mask's frame moves when it reads other marks, shape (n_modes,)."""
        marks, index = self.placement.marks[axis], self.placement.index
        layer = next(m for m in self.flow.masks if m.id == mask)
        shift = -self._vector(axis, self.walk.parts[mask, "read", axis])
        for reading, weight in layer.aligns_to.weighted(axis):
            shift -= weight * marks[index[reading.mask]]
        for reading, weight in References.model_construct(x=readings, y=readings).weighted(axis):
            fresh = self._vector(axis, self._read(mask, axis, reading))
            shift += weight * (marks[index[reading.mask]] + fresh)
        return shift

    def _read(self, mask: str, axis: Axis, reading: Reading) -> Amounts:
        """Return what reading one reference alone adds."""
        key = mask, axis, reading.mask, reading.alignment
        if key not in self._reads:
            layer = next(m for m in self.flow.masks if m.id == mask)
            self._reads[key] = self.walk.reads(layer, ((reading, 1.0),), axis)
        return self._reads[key]

    def _vector(self, axis: Axis, amounts: Iterable[tuple[int, float]]) -> FloatArray:
        found = np.zeros(self.placement.modes[axis].size)
        for mode, amount in amounts:
            found[self._columns[axis][mode]] += amount
        return found


def _replaced(base: Residuals, modes: IntArray, a: FloatArray, b: FloatArray) -> Residuals:
    """Return residuals over some modes with other patterns, shape (n_options, n_rows, n_modes) each."""
    overlay = b - a
    overlay[np.abs(overlay) <= _NOTHING * (np.abs(a) + np.abs(b))] = 0.0
    count = len(overlay)
    return Residuals(
        base.rows * count,
        overlay.reshape(-1, len(modes)),
        np.tile(base.edges[:, modes], (count, 1)),
        np.tile(base.drawn, count),
        np.tile(base.keep, count),
    )


def shares(flow: Flow, axis: Axis) -> FloatArray:
    """Return how far each layer moves with the printed frame of each mask.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    axis : {'x', 'y'}
        The axis.

    Returns
    -------
    ndarray, shape (n_layers + 1, n_layers + 1)
        Entry (i, m) is the share of layer i in a move of layer m, in the order of `Placement.index`.
    """
    index = {WAFER: 0} | {name: i + 1 for i, name in enumerate(flow.layers)}
    found = np.eye(len(index))
    for name, layer in flow.layers.items():
        i = index[name]
        if isinstance(layer, SelfAligned):
            found[i] = found[index[layer.follows.on(axis)]]
            continue
        for reading, weight in layer.aligns_to.weighted(axis):
            found[i] += weight * found[index[reading.mask]]
    return found

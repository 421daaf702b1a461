"""From a flow to ramps: what each quoted size does to every judged margin.

The flow is placed twice in one go: amounts are kept apart by the place in the file that quotes them,
and summed over the places of one physical error before anything is squared. A size of 0 leaves no
amount behind, so it is placed at one unit and taken out again.
"""

from collections import defaultdict
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flowplan.engine.board import Board
from flowplan.engine.levers.ramp import Ramp, Varying
from flowplan.engine.margin import needs
from flowplan.engine.parts import Kernel, quadratic
from flowplan.engine.placement import Placement, place
from flowplan.engine.residual import Residuals
from flowplan.engine.sources import FloatArray, IntArray, ModeTable
from flowplan.model.base import AXES, Axis
from flowplan.model.edits import with_size
from flowplan.model.flow import Flow
from flowplan.model.paths import Keys, Quoted, quoted_sizes
from flowplan.model.terms import Kind

#: Where a size is quoted, its kind, and which of its two numbers it is: for most errors the number
#: of the axis along which it acts; an alignment from mark sites acts along both with each.
Place = tuple[Keys, Kind, Axis]


@dataclass(frozen=True, slots=True)
class Sized:
    """One quoted size with its ramps.

    Attributes
    ----------
    quoted : Quoted
        The place.
    unit : float
        What t = 1 stands for [nm, urad or ppm]: the size, or one unit where it is 0.
    now : float
        t of the size as quoted: 1, or 0.
    ramps : tuple of Ramp
        One an axis on which a judged row depends on it.
    """

    quoted: Quoted
    unit: float
    now: float
    ramps: tuple[Ramp, ...]


class LeverSpace:
    """All quoted sizes of a flow and what they do.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    """

    def __init__(self, flow: Flow) -> None:
        self.flow = flow
        self.sizes = quoted_sizes(flow)
        zeros = [q for q in self.sizes if not q.in_base(flow.unit)]
        # A size of 0 must not come to equal its other axis: what is alike in x and y acts as one.
        self._one = 1.0
        while any(q.in_base(flow.unit) == self._one for q in self.sizes):
            self._one /= 2
        placed = flow
        for quoted in zeros:
            placed = with_size(placed, quoted, quoted.quantity(self._one, flow.unit))
        placement = place(placed, apart=True)
        self.board = Board.of(flow)
        off = {(q.keys, q.kind, axis) for q in zeros for axis in q.axes}
        self._axes = {axis: _Axis(self.board, placement, axis, off) for axis in AXES}
        self.margins = np.zeros(len(self.board.rows))
        for axis in AXES:
            self.margins[self.board.places[axis]] = self._axes[axis].margins

    def sized(self, quoted: Quoted) -> Sized:
        """Return one of `sizes` with its ramps."""
        size = quoted.in_base(self.flow.unit)
        places = [(quoted.keys, quoted.kind, axis) for axis in quoted.axes]
        ramps = (self._axes[axis].ramp(places) for axis in AXES)
        return Sized(
            quoted, size or self._one, 1.0 if size else 0.0, tuple(r for r in ramps if r is not None)
        )

    def margins_at(self, sized: Sized, t: float) -> FloatArray:
        """Return the margin of every row of the board with one size changed, shape (n_rows,) [nm]."""
        found = self.margins.copy()
        for ramp in sized.ramps:
            found[ramp.rows] = ramp.margins(t)
        return found


class _Axis:
    """One axis: residuals by place and by physical source."""

    def __init__(self, board: Board, placement: Placement, axis: Axis, off: set[Place]) -> None:
        self.flow = board.flow
        self.rows = board.places[axis]
        self.basis = board.sites.basis
        table = placement.modes[axis]
        apart = [placement.keys[s] for s in table.source]
        self.place_of = [place for _, place in apart]
        self.modes_of: dict[Place, list[int]] = defaultdict(list)
        for mode, place_of_mode in enumerate(self.place_of):
            self.modes_of[place_of_mode].append(mode)
        self.live = np.array([float(place not in off) for place in self.place_of])
        self.table, self.column = _merged(table, [key for key, _ in apart])
        self.order = np.argsort(self.column, kind="stable")
        self.starts = np.searchsorted(self.column[self.order], np.arange(self.table.size))
        self.kernel = Kernel.of(self.table, placement.sources, self.flow.sigma)
        res = board.residuals(placement, axis)
        self.by_place = res.overlay + res.edges
        self.total = self._summed(self.by_place * self.live)
        whole = Residuals(
            res.rows,
            self._summed(res.overlay * self.live),
            self._summed(res.edges * self.live),
            res.drawn,
            res.keep,
        )
        offset = self.kernel.offset_form(whole.overlay) @ self.basis
        side = res.drawn - res.keep + whole.edges @ self.kernel.offset
        self.room = side[:, None] - np.abs(offset)
        self.bound = self.kernel.absolute_sum(self.total, self.kernel.bound, self.basis)
        self.random = self._random(self.total)
        need = needs(self.bound, self.random, self.random)[self.flow.basis]
        self.margins = (self.room - need).min(axis=1) if len(self.rows) else np.zeros(0)

    def ramp(self, places: list[Place]) -> Ramp | None:
        """Return what one size, standing at these places, does; None where no row depends on it."""
        modes = [mode for place in places for mode in self.modes_of.get(place, [])]
        is_bound = places[0][1] == "bound"
        rows = np.flatnonzero(self.by_place[:, modes].any(axis=1))
        if not len(rows):
            return None
        is_mine = np.zeros(len(self.place_of))
        is_mine[modes] = 1.0
        own = self._summed(self.by_place[rows] * is_mine)
        rest = self._summed(self.by_place[rows] * self.live * (1 - is_mine))
        touched = np.isin(self.table.source, self.table.source[self.column[modes]])
        return Ramp(
            self.rows[rows],
            self.room[rows],
            (self.random if is_bound else self.bound)[rows],
            self._varying(own, rest, touched, is_bound=is_bound),
            self.flow.basis,
        )

    def _varying(
        self, own: FloatArray, rest: FloatArray, touched: NDArray[np.bool_], *, is_bound: bool
    ) -> Varying:
        """Split the amounts of a size (`own`) and of all others (`rest`) as a ramp wants them."""
        kernel, sources = self.kernel, self.table.source
        mixed = np.unique(sources[touched & (np.abs(rest) > 0).any(axis=0)])
        is_mixed = np.isin(sources, mixed)
        still, alone = np.where(touched, 0.0, rest), np.where(is_mixed, 0.0, own)
        is_root = not is_bound and self.flow.basis != "linear"
        weight = kernel.bound if is_bound else self.flow.confidence * kernel.sigma
        shared = []
        for source in mixed:
            at = np.flatnonzero(sources == source)
            scaled = self.basis[self.table.basis[at]] * weight[at][:, None]
            shared.append((rest[:, at] @ scaled, own[:, at] @ scaled))
        if is_root:
            square = self.flow.confidence**2
            parts = [quadratic(kernel.gram(a), self.basis) * square for a in (still, alone)]
        else:
            parts = [kernel.absolute_sum(a, weight, self.basis) for a in (still, alone)]
        return Varying(parts[0], parts[1], tuple(shared), is_root)

    def _random(self, amounts: FloatArray) -> FloatArray:
        confidence = self.flow.confidence
        if self.flow.basis == "linear":
            return confidence * self.kernel.absolute_sum(amounts, self.kernel.sigma, self.basis)
        return np.asarray(confidence * np.sqrt(quadratic(self.kernel.gram(amounts), self.basis)))

    def _summed(self, by_place: FloatArray) -> FloatArray:
        """Sum amounts over the places of each physical source, shape (n_rows, n_modes)."""
        if not self.table.size:
            return by_place
        return np.asarray(np.add.reduceat(by_place[:, self.order], self.starts, axis=1))


def _merged(table: ModeTable, keys: list[object]) -> tuple[ModeTable, IntArray]:
    """Return the modes with one source a key, and where each mode of `table` went."""
    first: dict[object, int] = {}
    for source, key in zip(table.source, keys, strict=True):
        first.setdefault(key, int(source))
    pairs = np.array([(first[k], b) for k, b in zip(keys, table.basis, strict=True)], dtype=np.int64)
    unique, column = np.unique(pairs.reshape(-1, 2), axis=0, return_inverse=True)
    source, basis = unique[:, 0], unique[:, 1]
    active, starts = np.unique(source, return_index=True)
    return ModeTable(source, basis, starts.astype(np.int64), active), column.reshape(-1)

"""Which other readings of a mask help which pairs, and what they do to the whole flow.

The axes do not meet: what an option does along x and along y is counted once for each, and the two
counts are added for a mask that reads the same marks on both.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from flowplan.engine.margin import verdict_of
from flowplan.engine.remedies.changes import Reread
from flowplan.engine.remedies.options import plain
from flowplan.engine.remedies.reread import Moved, RereadSpace
from flowplan.engine.remedies.result import Effect, Kind, Remedy
from flowplan.engine.residual import Row
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import AXES, Axis
from flowplan.model.edits import Readings


@dataclass(frozen=True, slots=True)
class _Tally:
    """What options do to the rows of one axis, one entry an option."""

    worst: FloatArray
    failing: IntArray
    worse: IntArray
    breaks: IntArray

    def effect(self, option: int, other: "_Tally", other_option: int) -> Effect:
        """Return the effect of an option here with one on the other axis."""
        pairs = [
            (mine[option], theirs[other_option])
            for mine, theirs in (
                (self.failing, other.failing), (self.worse, other.worse), (self.breaks, other.breaks),
            )
        ]  # fmt: skip
        failing, worse, breaks = (int(a + b) for a, b in pairs)
        return Effect(float(min(self.worst[option], other.worst[other_option])), failing, worse, breaks)


def rereads(space: RereadSpace, mask: str, needy: frozenset[int]) -> Iterator[tuple[int, Remedy]]:
    """Yield (row of the board, remedy) for every reading of a mask that helps a row in need.

    Parameters
    ----------
    space : RereadSpace
        The flow with its options.
    mask : str
        The mask that reads.
    needy : frozenset of int
        Rows of the board for which help is wanted.
    """
    before = next(m for m in space.flow.masks if m.id == mask).aligns_to
    moved = {axis: space.moved(mask, axis) for axis in AXES}
    tallies = {axis: _tally(space, axis, moved[axis]) for axis in AXES}
    still = {axis: _tally(space, axis, _unmoved()) for axis in AXES}
    number = {axis: {plain(o): i for i, o in enumerate(space.options[mask, axis])} for axis in AXES}
    for axis in AXES:
        other: Axis = "y" if axis == "x" else "x"
        options = space.options[mask, axis]
        for at, option in _helpful(space, moved[axis], needy):
            margin = float(moved[axis].margins[option, np.flatnonzero(moved[axis].rows == at)[0]])
            readings = options[option]
            alone = tallies[axis].effect(option, still[other], 0)
            yield (
                at,
                _remedy(space, at, margin, alone, Reread(mask, (axis,), (before.on(axis),), (readings,))),
            )
            twin = number[other].get(plain(readings))
            if twin is not None:
                on_other = space.options[mask, other][twin]
                after = (readings, on_other) if axis == "x" else (on_other, readings)
                change = Reread(mask, AXES, (before.x, before.y), after)
                both = tallies[axis].effect(option, tallies[other], twin)
                yield at, _remedy(space, at, margin, both, change)


def _helpful(space: RereadSpace, moved: Moved, needy: frozenset[int]) -> Iterator[tuple[int, int]]:
    """Yield (row, option) where an option raises the margin of a row in need."""
    for column, at in enumerate(moved.rows):
        if int(at) in needy:
            least = space.margins[at] + space.board.grain[at]
            for option in np.flatnonzero(moved.margins[:, column] > least):
                yield int(at), int(option)


def _remedy(space: RereadSpace, at: int, margin: float, effect: Effect, change: Reread) -> Remedy:
    row = space.board.rows[at]
    settled = float(space.board.settled(np.array([margin]), np.array([at]))[0])
    verdict = verdict_of(settled, float(space.board.drawn[at]), space.flow.reserve)
    readings = change.after[change.axes.index(row.axis)]
    return Remedy(_kind(change.mask, readings, row), change, settled, verdict, effect)


def _kind(mask: str, readings: Readings, row: Row) -> Kind:
    if len(readings) > 1:
        return "average"
    return "direct" if {mask, readings[0].mask} == {row.first, row.second} else "reference"


def _unmoved() -> Moved:
    """Return one option that changes nothing."""
    return Moved(np.zeros(0, dtype=np.int64), np.zeros((1, 0)))


def _tally(space: RereadSpace, axis: Axis, moved: Moved) -> _Tally:
    board = space.board
    before = board.settled(space.margins)
    rest = before[np.setdiff1d(board.places[axis], moved.rows)]
    after, base = board.settled(moved.margins, moved.rows), before[moved.rows]
    worse = after < base - board.grain[moved.rows]
    return _Tally(
        np.minimum(after.min(axis=1, initial=np.inf), rest.min(initial=np.inf)),
        (after < 0).sum(axis=1) + int((rest < 0).sum()),
        worse.sum(axis=1),
        (worse & (after < 0) & (base >= 0)).sum(axis=1),
    )

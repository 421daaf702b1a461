"""Rows of measured overlay, brought into nested order: reading, lot, wafer, field."""

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray, IntArray

_Key = IntArray | FloatArray


@dataclass(frozen=True, slots=True)
class Batch:
    """Measured rows; every wafer of a reading lies in one batch, in any order of rows.

    Attributes
    ----------
    reading, lot, wafer : ndarray of int, shape (n_rows,)
        Numbers that tell readings and lots apart in all batches, and wafers within this one.
    positions : ndarray, shape (n_rows, 4)
        Field centre X, Y and site x, y [mm].
    overlay : ndarray, shape (n_rows, 2)
        Mask minus reference along x and y [nm].
    row : ndarray of int, shape (n_rows,)
        Number of the row in the file, for messages.
    """

    reading: IntArray
    lot: IntArray
    wafer: IntArray
    positions: FloatArray
    overlay: FloatArray
    row: IntArray

    def __len__(self) -> int:
        return len(self.reading)

    def take(self, rows: IntArray | slice) -> "Batch":
        """Return some of the rows, or all in another order."""
        return Batch(
            self.reading[rows],
            self.lot[rows],
            self.wafer[rows],
            self.positions[rows],
            self.overlay[rows],
            self.row[rows],
        )


@dataclass(frozen=True, slots=True)
class Group:
    """The rows of one reading, in nested order.

    Attributes
    ----------
    rows : Batch
        The rows: wafers of a lot, fields of a wafer and sites of a field stand together.
    field_starts : ndarray of int, shape (n_fields,)
        First row of each field.
    wafer_starts : ndarray of int, shape (n_wafers,)
        First field of each wafer, among the fields.
    """

    rows: Batch
    field_starts: IntArray
    wafer_starts: IntArray

    @property
    def wafer_rows(self) -> IntArray:
        """First row of each wafer."""
        return self.field_starts[self.wafer_starts]

    @property
    def lots(self) -> IntArray:
        """The lot of each wafer."""
        return self.rows.lot[self.wafer_rows]


def groups_of(batch: Batch) -> tuple[tuple[int, Group], ...]:
    """Return the rows of each reading in nested order.

    Parameters
    ----------
    batch : Batch
        Rows in any order; rows that already stand together are not moved.

    Returns
    -------
    tuple of (int, Group)
        The reading's number and its rows.
    """
    if not len(batch):
        return ()
    levels: list[_Key] = [batch.reading, batch.lot, batch.wafer, batch.positions[:, 0], batch.positions[:, 1]]
    starts = _starts(levels)
    seen = _first_seen([key[starts] for key in levels])
    del seen[3]  # a field is X and Y together; all of one X need not stand together
    order = np.lexsort(seen[::-1])
    lengths = np.diff(np.append(starts, len(batch)))
    if not np.array_equal(order, np.arange(len(order))):
        batch = batch.take(_expanded(starts[order], lengths[order]))
        lengths, seen = lengths[order], [level[order] for level in seen]
        starts = np.cumsum(lengths) - lengths
    reading, _, wafer, field = seen
    fields = _starts([field])
    wafers = _starts([wafer[fields]])
    rows_of_fields = starts[fields]
    turns = starts[_starts([reading])]
    found = []
    for first, last in itertools.pairwise([*turns, len(batch)]):
        low, high = np.searchsorted(rows_of_fields, [first, last])
        own = wafers[(wafers >= low) & (wafers < high)] - low
        rows = batch if len(turns) == 1 else batch.take(slice(first, last))
        found.append((int(rows.reading[0]), Group(rows, rows_of_fields[low:high] - first, own)))
    return tuple(found)


def group_medians(values: FloatArray, starts: IntArray) -> FloatArray:
    """Return the median of each group of rows that stand together.

    Parameters
    ----------
    values : ndarray, shape (n_rows, n_columns)
        The values.
    starts : ndarray of int, shape (n_groups,)
        First row of each group.

    Returns
    -------
    ndarray, shape (n_groups, n_columns)
        Groups of one size are worked out together.
    """
    sizes = np.diff(np.append(starts, len(values)))
    found = np.empty((len(starts), values.shape[1]))
    if len(starts) and (sizes == sizes[0]).all():
        return np.asarray(np.median(values.reshape(len(starts), -1, values.shape[1]), axis=1))
    for size in np.unique(sizes):
        chosen = np.flatnonzero(sizes == size)
        rows = starts[chosen][:, None] + np.arange(size)
        found[chosen] = np.median(values[rows], axis=1)
    return found


def _starts(keys: Sequence[_Key]) -> IntArray:
    """Return where any key differs from the row before."""
    change = np.ones(len(keys[0]), dtype=bool)
    change[1:] = False
    for key in keys:
        change[1:] |= key[1:] != key[:-1]
    return np.flatnonzero(change)


def _first_seen(levels: Sequence[_Key]) -> list[IntArray]:
    """Return for each prefix of the keys where its value was first seen."""
    n = len(levels[0])
    order = np.lexsort(levels[::-1])
    found = []
    fresh = np.zeros(n, dtype=bool)
    fresh[0] = True
    for key in levels:
        ordered = key[order]
        fresh[1:] |= ordered[1:] != ordered[:-1]
        begins = np.flatnonzero(fresh)
        first = np.minimum.reduceat(order, begins)
        level = np.empty(n, dtype=np.int64)
        level[order] = np.repeat(first, np.diff(np.append(begins, n)))
        found.append(level)
    return found


def _expanded(starts: IntArray, lengths: IntArray) -> IntArray:
    """Return the rows of runs, run by run."""
    before = np.cumsum(lengths) - lengths
    return np.repeat(starts - before, lengths) + np.arange(int(lengths.sum()))

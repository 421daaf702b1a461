"""Sums of measured rows from which everything else follows, for any order and number of batches.

A row is z = (1, x, y, X + x, Y + y, dx', dy'): the basis functions of position, and the overlay less a
fixed pattern that keeps the numbers small. At each level of nesting the sum over groups of s s' / n is
kept, with s the group's sum of z. For any linear fit b the sum of squares of that level is then the
quadratic form of (-b, 1), so that rows are read once.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from flowplan.engine.measured.batch import Batch, Group, groups_of
from flowplan.engine.measured.cells import Cells
from flowplan.engine.measured.robust import LIMIT, deviations, ratios, robust_pattern, robust_sigma
from flowplan.engine.points import basis_at
from flowplan.engine.sources import N_BASIS, FloatArray, IntArray

N_COLUMNS = N_BASIS + 2
#: Outliers that are kept to be shown, the farthest.
_MOST_SHOWN = 20


@dataclass(frozen=True, slots=True)
class Outlier:
    """A row far from the rest of its wafer.

    Attributes
    ----------
    reading : int
        Number of the reading.
    row : int
        Number of the row in the file.
    overlay : tuple of float
        Along x and y [nm].
    ratio : float
        Robust standard deviations off.
    """

    reading: int
    row: int
    overlay: tuple[float, float]
    ratio: float


@dataclass(slots=True)
class LotSums:
    """One lot: sum of z, and the sums of squared numbers of rows of its wafers and fields."""

    total: FloatArray
    wafers_squared: float = 0.0
    fields_squared: float = 0.0


@dataclass(slots=True)
class Tally:
    """The sums of one reading.

    Attributes
    ----------
    pattern : ndarray, shape (n_basis, 2)
        What was taken off the overlay [nm, nm/mm].
    rows : ndarray, shape (n_columns, n_columns)
        Sum of z z' over rows.
    by_field, by_wafer : ndarray, shape (n_columns, n_columns)
        Sum over groups of s s' / n.
    lots : dict of int to LotSums
        The sums of each lot.
    n_fields, n_wafers, n_outliers : int
        Numbers of groups, and of rows found to be outliers.
    fields_per_wafer : float
        Sum over wafers of (sum over fields of n^2) / n.
    wafer_map, field_map : Cells
        Sums by place, for drawing.
    """

    pattern: FloatArray
    wafer_map: Cells
    field_map: Cells
    rows: FloatArray = field(default_factory=lambda: np.zeros((N_COLUMNS, N_COLUMNS)))
    by_field: FloatArray = field(default_factory=lambda: np.zeros((N_COLUMNS, N_COLUMNS)))
    by_wafer: FloatArray = field(default_factory=lambda: np.zeros((N_COLUMNS, N_COLUMNS)))
    lots: dict[int, LotSums] = field(default_factory=dict)
    n_fields: int = 0
    n_wafers: int = 0
    n_outliers: int = 0
    fields_per_wafer: float = 0.0

    @property
    def n(self) -> int:
        """Number of rows that count."""
        return round(float(self.rows[0, 0]))

    @property
    def n_lots(self) -> int:
        """Number of lots with rows that count."""
        return sum(1 for lot in self.lots.values() if lot.total[0] > 0)

    def by_lot(self) -> FloatArray:
        """Return the sum over lots of s s' / n."""
        return _outer([lot.total for lot in self.lots.values()])

    def add(self, z: FloatArray, group: Group) -> None:
        """Add rows; a row of zeros does not count."""
        self.rows += z.T @ z
        fields = np.add.reduceat(z, group.field_starts, axis=0)
        wafers = np.add.reduceat(fields, group.wafer_starts, axis=0)
        fields_squared = np.add.reduceat(fields[:, 0] ** 2, group.wafer_starts)
        self.by_field += _outer(fields)
        self.by_wafer += _outer(wafers)
        n_wafer = wafers[:, 0]
        full = n_wafer > 0
        self.n_fields += int(np.count_nonzero(fields[:, 0]))
        self.n_wafers += int(np.count_nonzero(full))
        self.fields_per_wafer += float((fields_squared[full] / n_wafer[full]).sum())
        self._add_lots(group.lots, wafers, fields_squared)
        centres = group.rows.positions[group.field_starts, :2]
        self.wafer_map.add(centres, fields)
        self.field_map.add(group.rows.positions[:, 2:], z)

    def _add_lots(self, lots: IntArray, wafers: FloatArray, fields_squared: FloatArray) -> None:
        for lot in np.unique(lots):
            chosen = lots == lot
            sums = self.lots.setdefault(int(lot), LotSums(np.zeros(N_COLUMNS)))
            sums.total += wafers[chosen].sum(axis=0)
            sums.wafers_squared += float((wafers[chosen, 0] ** 2).sum())
            sums.fields_squared += float(fields_squared[chosen].sum())


def _outer(sums: FloatArray | list[FloatArray]) -> FloatArray:
    """Return the sum of s s' / n over groups."""
    table = np.asarray(sums).reshape(-1, N_COLUMNS)
    table = table[table[:, 0] > 0]
    return np.asarray((table / table[:, :1]).T @ table)


@dataclass(slots=True)
class Ledger:
    """The tallies of all readings.

    Parameters
    ----------
    limit : float or None
        Robust standard deviations beyond which a row does not count; None keeps all rows.
    """

    limit: float | None = LIMIT
    tallies: dict[int, Tally] = field(default_factory=dict)
    outliers: list[Outlier] = field(default_factory=list)
    _sigma: dict[int, FloatArray] = field(default_factory=dict)

    def add(self, batch: Batch, tick: Callable[[], None] | None = None) -> None:
        """Add a batch of whole wafers.

        What outliers are held against is found in the first batch that has the reading.
        """
        for reading, group in groups_of(batch):
            self._add_group(reading, group)
            if tick:
                tick()

    def _add_group(self, reading: int, group: Group) -> None:
        places = group.rows.positions
        basis = basis_at(places)
        tally = self.tallies.get(reading)
        if tally is None:
            pattern = robust_pattern(basis, group.rows.overlay)
            tally = Tally(pattern, Cells.over(places[:, :2], 21), Cells.over(places[:, 2:], 9))
            self.tallies[reading] = tally
        z = np.empty((len(places), N_COLUMNS))
        z[:, :N_BASIS] = basis.T
        z[:, N_BASIS:] = group.rows.overlay - basis.T @ tally.pattern
        if self.limit is not None:
            self._leave_out(reading, group, z, self.limit)
        tally.add(z, group)

    def _leave_out(self, reading: int, group: Group, z: FloatArray, limit: float) -> None:
        """Note the outliers of a group and let them not count."""
        away = deviations(z[:, N_BASIS:], group.wafer_rows)
        if reading not in self._sigma:
            self._sigma[reading] = robust_sigma(away)
        off = ratios(away, self._sigma[reading])
        far = np.flatnonzero(off > limit)
        if not len(far):
            return
        z[far] = 0.0
        self.tallies[reading].n_outliers += len(far)
        farthest = far[np.argsort(-off[far], kind="stable")[:_MOST_SHOWN]]
        rows = group.rows
        self.outliers += [
            Outlier(reading, int(rows.row[i]), tuple(rows.overlay[i].tolist()), float(off[i]))
            for i in farthest
        ]
        self.outliers = sorted(self.outliers, key=lambda o: (-o.ratio, o.row))[:_MOST_SHOWN]

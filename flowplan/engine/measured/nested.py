"""How the variance splits: between lots, between a lot's wafers, a wafer's fields, a field's sites.

Estimators of the analysis of variance for nested random effects. For unequal numbers of rows the expected
sums of squares are taken with the numbers as they are (Henderson's method 1), which for equal numbers is
the textbook's table. A level with one group in each group above cannot be told from the level above and is
None; its share is in the level above it.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.measured.tally import Tally
from flowplan.engine.sources import FloatArray

LEVELS = ("lot", "wafer", "field", "site")


@dataclass(frozen=True, slots=True)
class Split:
    """Components of the variance along one axis [nm^2]; None where the data cannot tell.

    An estimate below 0, which happens by chance where a component is small, is kept as it came out.
    """

    lot: float | None
    wafer: float | None
    field: float | None
    site: float | None


def split_variance(tally: Tally, coefficients: FloatArray, axis: int) -> Split:
    """Split the variance of what a fit leaves.

    Parameters
    ----------
    tally : Tally
        Sums of one reading.
    coefficients : ndarray, shape (n_basis,)
        The fit along the axis [nm, nm/mm].
    axis : {0, 1}
        x or y.

    Returns
    -------
    Split
        The components.
    """
    weights = np.zeros(len(tally.rows))
    weights[: len(coefficients)] = tally.pattern[:, axis] - coefficients
    weights[len(coefficients) + axis] = 1.0
    n = float(tally.n)
    total = tally.rows[0]
    mean = np.outer(total, total) / n
    levels = (mean, tally.by_lot(), tally.by_wafer, tally.by_field, tally.rows)
    squares = np.diff([float(weights @ form @ weights) for form in levels])
    expected = _expected(tally, n)
    found: list[float | None] = [None] * len(LEVELS)
    for i in reversed(range(len(LEVELS))):
        if expected[i, i] > 1e-9 * n:
            rest = sum(expected[i, j] * (found[j] or 0.0) for j in range(i + 1, len(LEVELS)))
            found[i] = (float(squares[i]) - float(rest)) / float(expected[i, i])
    return Split(*found)


def mean_error(tally: Tally, split: Split) -> float | None:
    """Return the standard error of the mean of all rows [nm], wafers and lots being what is drawn.

    Parameters
    ----------
    tally : Tally
        Sums of one reading.
    split : Split
        Its components; those below 0 count as 0.

    Returns
    -------
    float or None
        None for a single wafer, whose own shift nothing tells from the mean.
    """
    if tally.n_wafers < 2:
        return None
    n = float(tally.n)
    held = _held_by_mean(tally, n)
    known = [max(part or 0.0, 0.0) for part in (split.lot, split.wafer, split.field, split.site)]
    return float(np.sqrt(held @ known / n))


def _held_by_mean(tally: Tally, n: float) -> FloatArray:
    """Return how much of each component the mean's sum of squares holds, shape (4,)."""
    lots = tally.lots.values()
    squares = (
        sum(float(lot.total[0]) ** 2 for lot in lots),
        sum(lot.wafers_squared for lot in lots),
        sum(lot.fields_squared for lot in lots),
        n,
    )
    return np.array(squares) / n


def _expected(tally: Tally, n: float) -> FloatArray:
    """Return the expected sum of squares of each level as amounts of each component, shape (4, 4)."""
    lots = [lot for lot in tally.lots.values() if lot.total[0] > 0]
    rows = np.array([float(lot.total[0]) for lot in lots])
    wafers = np.array([lot.wafers_squared for lot in lots])
    fields = np.array([lot.fields_squared for lot in lots])
    # Of each component, what the mean, lots, wafers, fields and rows hold.
    held = np.array(
        [
            _held_by_mean(tally, n),
            [n, (wafers / rows).sum(), (fields / rows).sum(), len(lots)],
            [n, n, tally.fields_per_wafer, tally.n_wafers],
            [n, n, n, tally.n_fields],
            [n, n, n, n],
        ]
    )
    return np.asarray(np.diff(held, axis=0))

"""Which rows are outliers: far from the rest of their own wafer, by a measure that they cannot pull.

The pattern that all wafers share is taken off first (a Huber fit), then each wafer's median. What is left
is held against 1.4826 times the median of its absolute values (MAD), which is the standard deviation of
normal errors. A wafer that is off as a whole is no outlier: it is what the variances are for.
"""

import numpy as np

from flowplan.engine.measured.batch import group_medians
from flowplan.engine.sources import FloatArray, IntArray

#: Robust standard deviations beyond which a row is an outlier. Of normal errors one in 500 million lies
#: beyond 6; at the 3.5 of common practice ten thousand sound sites would lose five, and 3 sigma flatter.
LIMIT = 6.0
#: MAD to standard deviation of normal errors, 1 / Phi^-1(3/4).
MAD_TO_SIGMA = 1.482602218505602
#: Rows from which the pattern is found.
_MOST_ROWS = 20_000
_HUBER = 1.345
_SWEEPS = 25
#: Wafers with fewer rows than this have no median worth taking off.
_FEW = 5


def robust_pattern(basis: FloatArray, overlay: FloatArray) -> FloatArray:
    """Fit a pattern by Huber's method, iteratively reweighted.

    Parameters
    ----------
    basis : ndarray, shape (n_basis, n_rows)
        Basis functions at the rows.
    overlay : ndarray, shape (n_rows, 2)
        Overlay [nm].

    Returns
    -------
    ndarray, shape (n_basis, 2)
        Coefficients; of patterns that fit equally well the smallest.
    """
    step = -(-basis.shape[1] // _MOST_ROWS)
    design, values = basis[:, ::step].T, overlay[::step]
    found = np.empty((basis.shape[0], 2))
    for axis in (0, 1):
        target = values[:, axis]
        weight = np.ones(len(target))
        for _ in range(_SWEEPS):
            root = np.sqrt(weight)
            fit = np.linalg.lstsq(design * root[:, None], target * root, rcond=1e-10)[0]
            distance = np.abs(target - design @ fit)
            reach = _HUBER * MAD_TO_SIGMA * float(np.median(distance))
            if reach == 0:
                break
            fresh = np.minimum(1.0, reach / np.maximum(distance, reach))
            if np.abs(fresh - weight).max() < 1e-3:
                break
            weight = fresh
        found[:, axis] = fit
    return found


def deviations(rest: FloatArray, wafer_rows: IntArray) -> FloatArray:
    """Return how far each row lies from its wafer's median.

    Parameters
    ----------
    rest : ndarray, shape (n_rows, 2)
        Overlay less the shared pattern [nm], wafer by wafer.
    wafer_rows : ndarray of int, shape (n_wafers,)
        First row of each wafer.

    Returns
    -------
    ndarray, shape (n_rows, 2)
        Absolute values [nm]. Where wafers have fewer than five rows on average, from the median of all.
    """
    if len(rest) < _FEW * len(wafer_rows):
        return np.abs(rest - np.median(rest, axis=0))
    lengths = np.diff(np.append(wafer_rows, len(rest)))
    away = rest - np.repeat(group_medians(rest, wafer_rows), lengths, axis=0)
    return np.asarray(np.abs(away, out=away))


def robust_sigma(away: FloatArray) -> FloatArray:
    """Return the robust standard deviation along x and y [nm], shape (2,), of absolute deviations."""
    return np.array([MAD_TO_SIGMA * float(np.median(away[:, axis])) for axis in (0, 1)])


def ratios(away: FloatArray, sigma: FloatArray) -> FloatArray:
    """Return how many robust standard deviations each row lies off, on the worse axis, shape (n_rows,).

    Where a standard deviation is 0, more than half of the rows being alike, nothing is judged.
    """
    found = np.zeros(len(away))
    for axis in (0, 1):
        if sigma[axis] > 0:
            np.maximum(found, away[:, axis] / sigma[axis], out=found)
    return found

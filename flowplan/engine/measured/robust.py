"""Which rows are outliers: far from the rest of their own wafer, by a measure that they cannot pull.

The pattern that all wafers share is taken off first (a Huber fit), then each wafer's median. What is left
is held against 1.4826 times the median of its absolute values (MAD), which is the standard deviation of
normal errors. A wafer that is off as a whole is no outlier: it is what the variances are for.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.measured.batch import Group, group_medians
from flowplan.engine.points import basis_at
from flowplan.engine.sources import BoolArray, FloatArray

#: Robust standard deviations beyond which a row is an outlier. Of normal errors one in 500 million lies
#: beyond 6; at the 3.5 of common practice ten thousand sound sites would lose five, and 3 sigma flatter.
LIMIT = 6.0
#: MAD to standard deviation of normal errors, 1 / Phi^-1(3/4).
MAD_TO_SIGMA = 1.482602218505602
#: Rows from which the pattern is found.
_MOST_ROWS = 100_000
_HUBER = 1.345
_SWEEPS = 25
#: Wafers with fewer rows than this have no median worth taking off.
_FEW = 5


@dataclass(frozen=True, slots=True)
class Robust:
    """What a reading's rows are held against.

    Attributes
    ----------
    pattern : ndarray, shape (n_basis, 2)
        Coefficients of the shared pattern along x and y [nm, nm/mm].
    sigma : ndarray, shape (2,)
        Robust standard deviation within a wafer along x and y [nm]; where it is 0 nothing is judged.
    """

    pattern: FloatArray
    sigma: FloatArray


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


def robust_of(group: Group) -> Robust:
    """Return what the rows of a group are to be held against."""
    pattern = robust_pattern(basis_at(group.rows.positions), group.rows.overlay)
    return Robust(pattern, MAD_TO_SIGMA * np.median(np.abs(deviations(group, pattern)), axis=0))


def deviations(group: Group, pattern: FloatArray) -> FloatArray:
    """Return how far each row lies from its wafer's median, the pattern taken off.

    Parameters
    ----------
    group : Group
        Rows of one reading.
    pattern : ndarray, shape (n_basis, 2)
        The shared pattern.

    Returns
    -------
    ndarray, shape (n_rows, 2)
        [nm]. Where wafers have fewer than five rows on average, from the median of all rows.
    """
    rest = group.rows.overlay - basis_at(group.rows.positions).T @ pattern
    starts = group.wafer_rows
    if len(rest) < _FEW * len(starts):
        return np.asarray(rest - np.median(rest, axis=0))
    lengths = np.diff(np.append(starts, len(rest)))
    return np.asarray(rest - np.repeat(group_medians(rest, starts), lengths, axis=0))


def outlying(group: Group, robust: Robust) -> FloatArray:
    """Return how many robust standard deviations each row lies off, on the worse axis, shape (n_rows,)."""
    away = np.abs(deviations(group, robust.pattern))
    judged = robust.sigma > 0
    ratios = np.where(judged, away / np.where(judged, robust.sigma, 1.0), 0.0)
    return np.asarray(ratios.max(axis=1))


def kept(ratios: FloatArray, limit: float) -> BoolArray:
    """Return which rows are no outliers."""
    return np.asarray(ratios <= limit)

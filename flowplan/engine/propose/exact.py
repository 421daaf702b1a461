"""What whole plans give: every judged pair's value, many plans at a time."""

import math

import numpy as np

from flowplan.engine.propose.atoms import BOUND, VARIANCE, AxisAtoms
from flowplan.engine.sources import FloatArray, IntArray

#: A margin this small against its own terms is 0, as in the engine.
_DUST = 1e-12
#: A pair that is certain to fail counts as this chance of being good, so that sums stay finite.
LEAST_CHANCE = 1e-16

_ERFC = np.frompyfunc(math.erfc, 1, 1)


def tails(room: FloatArray, sigma: FloatArray) -> FloatArray:
    """Return the probability that a normal error exceeds the room on one side."""
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.where(sigma > 0, room / sigma, np.where(room < 0, -np.inf, np.inf))
    return 0.5 * np.asarray(_ERFC(ratio / math.sqrt(2)), dtype=np.float64)


def log_chance(failure: FloatArray) -> FloatArray:
    """Return log(1 - failure), not below log(LEAST_CHANCE)."""
    return np.asarray(np.log1p(-np.minimum(failure, 1 - LEAST_CHANCE)))


def settled(value: FloatArray, terms: FloatArray) -> FloatArray:
    """Return the values with what is nothing but the rounding of their terms made 0."""
    return np.where(np.abs(value) <= _DUST * terms, 0.0, value)


def values(axis: AxisAtoms, plans: IntArray, *, as_yield: bool) -> FloatArray:
    """Return what every judged pair gets under whole plans.

    Parameters
    ----------
    axis : AxisAtoms
        One axis of the flow.
    plans : ndarray of int, shape (n_plans, n_masks)
        The option of each mask; the wafer's is 0.
    as_yield : bool
        Whether log(1 - fail probability) is wanted instead of the margin.

    Returns
    -------
    ndarray, shape (n_plans, n_rows)
        Margins [nm] on the flow's basis at the worst site, or logarithms there.
    """
    sizes, signed = _residuals(axis, plans)
    rows = axis.rows
    sizes = sizes + axis.shared_sizes(signed[..., 1:]) + rows.edges[:, None]
    offset = signed[..., 0]
    need = axis.need(sizes)
    room = rows.room[:, None]
    margins = settled(room - np.abs(offset) - need, rows.scale[:, None] + np.abs(offset) + need)
    worst = margins.argmin(axis=2)[..., None]
    if not as_yield:
        return np.take_along_axis(margins, worst, axis=2)[..., 0]
    sigma = np.sqrt(np.take_along_axis(sizes[..., VARIANCE], worst, axis=2)[..., 0])
    bound = np.take_along_axis(sizes[..., BOUND], worst, axis=2)[..., 0]
    offset = np.take_along_axis(offset, worst, axis=2)[..., 0]
    left = np.stack([rows.room + side * offset - bound for side in (1, -1)])
    left = settled(left, rows.scale + bound + np.abs(offset))
    short, ample = left.min(axis=0), left.max(axis=0)
    far = tails(ample, sigma)
    with np.errstate(divide="ignore"):
        good = np.log(np.maximum(tails(-short, sigma) - far, LEAST_CHANCE))  # no 1 - 1 where it fails
    return np.where(short < 0, good, log_chance(tails(short, sigma) + far))


def _residuals(axis: AxisAtoms, plans: IntArray) -> tuple[FloatArray, FloatArray]:
    """Return sizes and signed amounts of every pair's overlay, shape (n_plans, n_rows, n_sites, ...)."""
    frames, marks, signed = frames_of(axis, plans)
    every = np.arange(axis.n_masks)
    first, second = axis.rows.first, axis.rows.second
    own = axis.layer.sizes + axis.reads.parts.sizes[every, plans]
    total = np.zeros((len(plans), len(first), *own.shape[2:]))
    for coefficient, what in (
        (frames[:, second] - frames[:, first], own),
        (marks[:, second] - marks[:, first], axis.marks.sizes),
    ):
        if what is axis.marks.sizes and not axis.has_marks:
            continue
        total[..., VARIANCE] += coefficient**2 @ what[..., VARIANCE]
        if axis.basis == "linear" or axis.has_bounds:
            total[..., BOUND:] += _times(np.abs(coefficient), what[..., BOUND:])
    differ = (first != second)[:, None, None]
    total += np.where(differ, axis.pattern.sizes[first] + axis.pattern.sizes[second], 0.0)
    placed = signed + axis.pattern.signed
    return total, placed[:, second] - placed[:, first]


def _times(coefficient: FloatArray, what: FloatArray) -> FloatArray:
    """Multiply over the masks, keeping the trailing axes."""
    flat = what.reshape(*what.shape[:-2], -1)
    return np.asarray((coefficient @ flat).reshape(*coefficient.shape[:-1], *what.shape[-2:]))


def frames_of(axis: AxisAtoms, plans: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return what the printed frame of every mask is made of under whole plans.

    Returns
    -------
    frames, marks : ndarray, shape (n_plans, n_masks, n_masks)
        Share of each mask's own errors, and of its marks' errors, in every frame.
    signed : ndarray, shape (n_plans, n_masks, n_sites, 1 + n_shared)
        Signed amounts in every frame.
    """
    n, reads = axis.n_masks, axis.reads
    frames, marks = np.zeros((2, len(plans), n, n))
    signed = np.zeros((len(plans), n, *axis.layer.signed.shape[1:]))
    which = np.arange(len(plans))
    for i in range(1, n):
        option = plans[:, i]
        if axis.has_signed:
            signed[:, i] = axis.layer.signed[i] + reads.parts.signed[i, option]
        for k in range(int(axis.most_read[i])):
            weight, reference = reads.weights[i, option, k], reads.masks[i, option, k]
            frames[:, i] += weight[:, None] * frames[which, reference]
            if axis.has_marks:
                marks[:, i] += weight[:, None] * marks[which, reference]
                marks[which, i, reference] += weight
            if axis.has_signed:
                passed = signed[which, reference] + axis.marks.signed[reference]
                signed[:, i] += weight[:, None, None] * passed
        frames[:, i, i] = 1.0
    return frames, marks, signed

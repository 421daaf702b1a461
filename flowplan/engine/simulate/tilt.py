"""Exponential tilts: the change of the draws that makes a rare failure ordinary.

A side of a row fails when L = -(E + s e) exceeds its room. Tilting every scalar's density by
exp(theta L) keeps the scalars independent: a normal is shifted by theta times its coefficient, a
uniform leans towards one end. With

    K(theta) = log E[exp(theta L)] = theta^2 sigma^2 / 2 + sum log(sinh(theta b) / (theta b))

the mean of L becomes K'(theta), and the theta with K'(theta) = room puts the mean on the edge of
failure, which makes the estimate's relative error grow only slowly as failures get rarer (the
efficient tilt for sums of independent terms, Siegmund 1976).
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray

_HALVINGS = 80
#: Tilts below this are series, to keep the digits.
_SMALL = 1e-4


@dataclass(frozen=True, slots=True)
class Tilts:
    """One tilt a side of a row.

    Attributes
    ----------
    theta : ndarray, shape (n_sides,)
        The tilts [1/nm]; 0 where failure is not rare.
    log_mean : ndarray, shape (n_sides,)
        K(theta).
    chance : ndarray, shape (n_sides,)
        A rough estimate of the side's fail probability, 0 where it cannot fail.
    """

    theta: FloatArray
    log_mean: FloatArray
    chance: FloatArray


def tilts_of(variance: FloatArray, flat: FloatArray, room: FloatArray) -> Tilts:
    """Return the tilt of every side.

    Parameters
    ----------
    variance : ndarray, shape (n_sides,)
        Variance of the normal part of L [nm^2].
    flat : ndarray, shape (n_sides, n_flat)
        Half-widths of the uniform parts of L [nm].
    room : ndarray, shape (n_sides,)
        Room [nm].
    """
    flat = -np.sort(-np.abs(flat), axis=1)
    flat = flat[:, flat.any(axis=0)]  # as many as the row with the most of them has
    reach = flat.sum(axis=1)
    impossible = (variance == 0) & (reach <= room)
    rare = (room > 0) & ~impossible
    scale = np.sqrt(variance + (flat**2).sum(axis=1) / 3)
    high = np.where(rare, _largest(variance, flat, reach, room), 0.0)
    mixed = np.flatnonzero(rare & (reach > 0))
    high[mixed] = _edge(variance[mixed], flat[mixed], room[mixed], high[mixed])
    theta = high
    log_mean = theta**2 * variance / 2 + log_mean_uniform(theta[:, None] * flat).sum(axis=1)
    # Probability of the tail beyond the tilted mean, by its leading term, at most 1.
    chance = np.exp(log_mean - theta * np.where(rare, room, 0.0)) / (1 + theta * scale)
    return Tilts(theta, log_mean, np.where(impossible, 0.0, chance))


def _largest(variance: FloatArray, flat: FloatArray, reach: FloatArray, room: FloatArray) -> FloatArray:
    """Return tilts that are surely large enough, exact where all is normal.

    Uniform parts only add to K', so that the normal part alone needs the largest tilt; without one,
    each uniform's mean is within 1/theta of its end.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        alone = flat.shape[1] / np.maximum(reach - room, 1e-300)
        return np.asarray(np.where(variance > 0, room / variance, alone))


def _edge(variance: FloatArray, flat: FloatArray, room: FloatArray, high: FloatArray) -> FloatArray:
    """Return the tilts with K' = room by halving, between 0 and what is large enough."""
    low = np.zeros_like(high)
    for _ in range(_HALVINGS):
        middle = (low + high) / 2
        short = middle * variance + _lean(middle[:, None] * flat, flat).sum(axis=1) < room
        low, high = np.where(short, middle, low), np.where(short, high, middle)
    return high


def _lean(tilt: FloatArray, flat: FloatArray) -> FloatArray:
    """Return the mean of uniforms of these half-widths under tilts: b (coth t - 1/t)."""
    safe = np.where(tilt > _SMALL, tilt, 1.0)
    return np.asarray(flat * np.where(tilt > _SMALL, 1 / np.tanh(safe) - 1 / safe, tilt / 3))


def log_mean_uniform(tilt: FloatArray) -> FloatArray:
    """Return log(sinh t / t), the uniforms' part of K."""
    size = np.abs(tilt)
    safe = np.where(size > _SMALL, size, 1.0)
    return np.asarray(
        np.where(size > _SMALL, safe + np.log1p(-np.exp(-2 * safe)) - np.log(2 * safe), size**2 / 6)
    )


def tilted_uniform(share: FloatArray, tilt: FloatArray) -> FloatArray:
    """Return draws over -1 to 1 with a density proportional to exp(t u).

    Parameters
    ----------
    share : ndarray
        Uniform over 0 to 1: the share of the distribution that lies below the draw.
    tilt : ndarray
        The tilts t, of a shape that fits `share`.
    """
    size = np.abs(tilt)
    safe = np.where(size > _SMALL, size, 1.0)
    towards = np.where(tilt < 0, 1 - share, share)
    leaning = 1 + np.log(towards + (1 - towards) * np.exp(-2 * safe)) / safe
    return np.asarray(np.where(size > _SMALL, np.copysign(1.0, tilt) * leaning, 2 * share - 1))

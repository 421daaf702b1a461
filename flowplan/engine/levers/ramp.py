"""Margins as functions of one quoted size, exact at every value of it.

With t the size over what it was measured at, the amount of a source s that the size takes part in is
u_s + t v_s, and every other amount stays. So with A, C and the sums over sources at each site

    variance  A + C t^2 + sum_s ((u_s + t v_s) sigma_s)^2
    bound     A + C t   + sum_s |u_s + t v_s|               (the same for the linear sum of deviations)

where the sums are over the few sources that the size shares with other places of the file, C over
those that it has for itself. Both are convex in t >= 0, and so is every need; a margin, and the
smallest of several margins, is concave. A concave function is at least 0 on one interval, whose upper
end Newton's rule finds from the right: each tangent lies above the function, so no step oversteps.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.flow import Basis

Side = Literal[-1, 1]
#: Steps of the search; Newton's rule takes a handful.
_MOST_STEPS = 200
#: A margin this small against its own terms is 0; the rest is rounding.
_DUST = 1e-13
#: What is asked for beyond this multiple of the size has no limit that matters.
_FAR = 1e60


@dataclass(frozen=True, slots=True)
class Varying:
    """The part of a need that changes with the size, at every row and site.

    Attributes
    ----------
    still, own : ndarray, shape (n_rows, n_sites)
        A and C of the module's formulas [nm^2, or nm].
    shared : tuple of (ndarray, ndarray)
        For each source shared with other places u and v, already times sigma [nm].
    is_root : bool
        Whether it is a root-sum-square rather than a plain sum.
    """

    still: FloatArray
    own: FloatArray
    shared: tuple[tuple[FloatArray, FloatArray], ...]
    is_root: bool

    def value(self, t: float) -> FloatArray:
        """Return the part at a size, shape (n_rows, n_sites) [nm]."""
        if self.is_root:
            return np.asarray(np.sqrt(self._square(t)))
        return self.still + self.own * t + sum(np.abs(u + t * v) for u, v in self.shared)

    def slope(self, t: float, side: Side) -> FloatArray:
        """Return the derivative in t towards larger (1) or smaller (-1) sizes, shape as `value`."""
        if self.is_root:
            half = self.own * t + sum(v * (u + t * v) for u, v in self.shared)
            root = np.sqrt(self._square(t))
            tip = side * np.sqrt(self.own + sum(v * v for _, v in self.shared))
            return np.where(root > 0, half / np.where(root > 0, root, 1.0), tip)
        bent = (np.where(u + t * v == 0, side * np.abs(v), np.sign(u + t * v) * v) for u, v in self.shared)
        return self.own + sum(bent)

    def _square(self, t: float) -> FloatArray:
        return self.still + self.own * t * t + sum((u + t * v) ** 2 for u, v in self.shared)


@dataclass(frozen=True, slots=True)
class Ramp:
    """The margins of some rows of one axis as functions of one size.

    Attributes
    ----------
    rows : ndarray of int, shape (n_rows,)
        Which rows of the board.
    room, fixed : ndarray, shape (n_rows, n_sites)
        Drawn dimension with offsets less what must remain, and the part of the need that the size
        does not change [nm].
    varying : Varying
        The part that it changes.
    basis : {'mixed', 'rss', 'linear'}
        How the two add up.
    """

    rows: IntArray
    room: FloatArray
    fixed: FloatArray
    varying: Varying
    basis: Basis

    def at(self, t: float) -> FloatArray:
        """Return the margins at a size, shape (n_rows, n_sites) [nm]."""
        part = self.varying.value(t)
        need = np.hypot(self.fixed, part) if self.basis == "rss" else self.fixed + part
        return self.room - need

    def slope(self, t: float, side: Side) -> FloatArray:
        """Return the derivatives of the margins in t on one side, shape (n_rows, n_sites) [nm]."""
        slope = self.varying.slope(t, side)
        if self.basis != "rss":
            return -slope
        part = self.varying.value(t)
        need = np.hypot(self.fixed, part)
        return -np.where(need > 0, part * slope / np.where(need > 0, need, 1.0), slope)

    def margins(self, t: float) -> FloatArray:
        """Return each row's margin at its worst site, shape (n_rows,) [nm]."""
        return np.asarray(self.at(t).min(axis=1))

    def only(self, row: int) -> "Ramp":
        """Return the ramp of one row of the board."""
        at = np.flatnonzero(self.rows == row)
        shared = tuple((u[at], v[at]) for u, v in self.varying.shared)
        varying = Varying(self.varying.still[at], self.varying.own[at], shared, self.varying.is_root)
        return Ramp(self.rows[at], self.room[at], self.fixed[at], varying, self.basis)


def largest(ramps: Sequence[Ramp], target: float | FloatArray = 0.0) -> float | None:
    """Return the largest t >= 0 at which every margin reaches its target.

    Parameters
    ----------
    ramps : sequence of Ramp
        One an axis; rows of all of them count.
    target : float or ndarray, shape (n_board_rows,)
        What each margin of the board must reach [nm].

    Returns
    -------
    float or None
        t; infinite where no size is too large, None where none is small enough.
    """
    t = 1.0
    while t < _FAR:
        lowest, slope = _lowest(ramps, t, target)
        if lowest < 0 and slope < 0:
            return _down_from(ramps, t, target)
        t *= 4
    return math.inf


def _down_from(ramps: Sequence[Ramp], t: float, target: float | FloatArray) -> float | None:
    """Return the largest t' <= t that reaches the target, where everything above t fails."""
    grain = _DUST * max(float(np.abs(r.room).max(initial=0.0)) for r in ramps)
    for _ in range(_MOST_STEPS):
        lowest, slope = _lowest(ramps, t, target)
        if lowest >= -grain:
            return t
        if slope >= 0:
            return None  # the tangent says that everything below fails as well
        smaller = t - lowest / slope
        if smaller < 0:
            return 0.0 if _lowest(ramps, 0.0, target)[0] >= -grain else None
        if smaller >= t:
            return t
        t = smaller
    return t


def _lowest(ramps: Sequence[Ramp], t: float, target: float | FloatArray) -> tuple[float, float]:
    """Return the smallest margin above its target and the slope of it towards smaller t."""
    found = (math.inf, 0.0)
    for ramp in ramps:
        wanted = target if isinstance(target, float) else target[ramp.rows][:, None]
        left = ramp.at(t) - wanted
        if left.size and left.min() < found[0]:
            place = np.unravel_index(left.argmin(), left.shape)
            found = float(left[place]), float(ramp.slope(t, -1)[place])
    return found

"""The landed area: the product of the overlaps in x and y, whose displacements may be correlated.

A correlation is taken apart into one common standard normal z: given z, x and y are independent, and
each has its own distribution of the overlap (`overlap.Interval`). So, with F the share at or below,

    P(A < a) = integral over z of  density(z) integral of  P(Ly < a / lx | z) dP(Lx < lx | z)
"""

import math
from dataclasses import dataclass

import numpy as np

from flowplan.engine.landing.normal import REACH, density, panels
from flowplan.engine.landing.overlap import STEEP, Interval
from flowplan.engine.sources import FloatArray

#: What is less than asked by no more than this share of it is not less: it is rounding.
_SAME = 1e-7
#: Secants that differ by more than this factor lie beside a jump.
_CLIFF = 1e4
_MOST_STEPS = 64
#: Probabilities and shares below this are not told from 0, and no figure has more decimals than these.
_LEAST, _DIGITS = 1e-9, 10
#: The distribution rises by this much only where it jumps.
_JUMP = 1e-3
#: Elsewhere a bracket this narrow is finished by a straight line.
_NARROW = 1e-5


@dataclass(frozen=True, slots=True)
class _Table:
    """The distribution of one overlap given each z.

    Attributes
    ----------
    lengths : ndarray, shape (n,)
        0 and more [nm].
    above : ndarray, shape (m, n)
        P(L > l) for each z.
    """

    lengths: FloatArray
    above: FloatArray
    slopes: FloatArray

    @classmethod
    def of(cls, axis: Interval, mean: FloatArray, sigma: float) -> "_Table":
        coarse = axis.lengths()
        lengths = np.sort(np.concatenate([coarse, (coarse[1:] + coarse[:-1]) / 2]))
        above = axis.exceeds(np.concatenate([[100 * axis.least], lengths[1:]]), mean, sigma)
        return cls(lengths, above, _slopes(lengths, above))

    def at(self, lengths: FloatArray) -> FloatArray:
        """Return P(L > l) for each z at other lengths; shape (m, *lengths.shape)."""
        cell = np.clip(np.searchsorted(self.lengths, lengths, side="right") - 1, 0, len(self.lengths) - 2)
        width = self.lengths[cell + 1] - self.lengths[cell]
        t = np.minimum((lengths - self.lengths[cell]) / width, 1.0)
        low, high = self.above[:, cell], self.above[:, cell + 1]
        left, right = self.slopes[:, cell] * width, self.slopes[:, cell + 1] * width
        rise = high - low
        return np.asarray(
            low + t * (left + t * (3 * rise - 2 * left - right + t * (left + right - 2 * rise)))
        )

    def mean(self) -> FloatArray:
        """Return the mean of L for each z, by Simpson's rule, shape (m,)."""
        left, middle, right = self.above[:, :-2:2], self.above[:, 1::2], self.above[:, 2::2]
        return np.asarray(((left + 4 * middle + right) / 6 * np.diff(self.lengths[::2])).sum(axis=1))


def _slopes(x: FloatArray, y: FloatArray) -> FloatArray:
    """Return slopes of cubics that overshoot nowhere (harmonic means of neighbouring secants)."""
    width = np.diff(x)
    secant = np.diff(y, axis=1) / width
    found = np.zeros_like(y)
    a, b = secant[:, :-1], secant[:, 1:]
    weight = (2 * width[1:] + width[:-1]) / (3 * (width[1:] + width[:-1]))
    both = a * b > 0
    divisor = np.where(both, (1 - weight) * a + weight * b, 1.0)
    smooth = np.where(both, a * b / divisor, 0.0)
    # beside a jump the slope is that of the other side
    smooth = np.where(np.abs(a) > _CLIFF * np.abs(b), b, np.where(np.abs(b) > _CLIFF * np.abs(a), a, smooth))
    found[:, 1:-1] = smooth
    found[:, 0], found[:, -1] = secant[:, 0], secant[:, -1]
    return found


@dataclass(frozen=True, slots=True)
class LandedArea:
    """The distribution of the landed area as a share of the drawn contact's.

    Attributes
    ----------
    drawn : float
        The drawn contact's area [nm^2].
    x, y : Interval
        The axes.
    """

    drawn: float
    x: Interval
    y: Interval
    _tables: tuple[_Table, _Table]
    _weight: FloatArray

    @classmethod
    def of(cls, drawn: float, x: Interval, y: Interval, covariance: float) -> "LandedArea":
        """Return the distribution.

        Parameters
        ----------
        drawn : float
            The drawn contact's area [nm^2].
        x, y : Interval
            The axes.
        covariance : float
            Of the displacements along x and y [nm^2].
        """
        share = covariance / (x.sigma * y.sigma) if covariance else 0.0
        share = max(-1.0, min(1.0, share))
        z, weight = _common(abs(share))
        common, own = math.sqrt(abs(share)), math.sqrt(max(0.0, 1 - abs(share)))
        tables = tuple(
            _Table.of(axis, axis.mean + sign * common * axis.sigma * z, own * axis.sigma)
            for axis, sign in ((x, 1.0), (y, math.copysign(1.0, share)))
        )
        return cls(drawn, x, y, (tables[0], tables[1]), weight)

    def less(self, share: float) -> float:
        """Return the probability that less than a share lands, right to about 1e-9 and a ten-thousandth.

        Parameters
        ----------
        share : float
            Share of the drawn area, above 0.
        """
        return _settled(self._less(share * self.drawn * (1 - _SAME)))

    def _less(self, area: float) -> float:
        x, y = self._tables
        beyond = area / y.lengths[1:]  # where the other axis changes, seen along x
        cells = np.unique(np.concatenate([x.lengths, beyond[beyond < x.lengths[-1]]]))
        fine = np.sort(np.concatenate([cells, (cells[1:] + cells[:-1]) / 2]))
        above = x.at(fine)
        halves = self._more(area, fine, above), self._more(area, fine[::2], above[:, ::2])
        more = (4 * halves[0] - halves[1]) / 3  # halved cells leave a quarter of the error
        return min(1.0, max(0.0, 1 - more))

    def _more(self, area: float, lengths: FloatArray, above: FloatArray) -> float:
        middle = (lengths[1:] + lengths[:-1]) / 2
        falls = -np.diff(above, axis=1)
        return float(self._weight @ (falls * self._tables[1].at(area / middle)).sum(axis=1))

    def open(self) -> float:
        """Return the probability that nothing lands."""
        x, y = self._tables
        return _settled(float(np.clip(1 - self._weight @ (x.above[:, 0] * y.above[:, 0]), 0.0, 1.0)))

    def mean(self) -> float:
        """Return the mean share."""
        x, y = self._tables
        found = float(self._weight @ (x.mean() * y.mean())) / self.drawn
        return _settled(found)

    def quantile(self, probability: float) -> float:
        """Return the share below which the landed area lies with a probability; 0 where it is an open."""
        if self.open() >= probability:
            return 0.0
        low, high = 0.0, float(self._tables[0].lengths[-1] * self._tables[1].lengths[-1]) / self.drawn
        below, above = self.open() - probability, 1 - probability
        for i in range(_MOST_STEPS):
            if high - low <= (STEEP if above - below > _JUMP else _NARROW) * high:
                break
            # every other step halves, so that a jump of the distribution holds nothing up
            part = 0.5 if i % 2 else min(0.99, max(0.01, below / (below - above)))
            tried = low + part * (high - low)
            value = self._less(tried * self.drawn) - probability
            if value < 0:
                low, below = tried, value
            else:
                high, above = tried, value
        found = high if above - below > _JUMP else low + (high - low) * below / (below - above)
        return _settled(found)


def _settled(value: float) -> float:
    """Return a figure to the digits that integration knows; what is less than that is 0."""
    return round(value, _DIGITS) if value > _LEAST else 0.0


def _common(share: float) -> tuple[FloatArray, FloatArray]:
    """Return where the common part z is looked at, and the weights; more densely the more it explains."""
    if share <= STEEP:
        return np.zeros(1), np.ones(1)
    if share < 0.7:
        z, weight = np.polynomial.hermite_e.hermegauss(8 if share < 0.1 else 16 if share < 0.4 else 32)
        return z, weight / math.sqrt(2 * math.pi)
    intervals = min(30, math.ceil(4 / math.sqrt(max(1 - share, 1e-6))))
    z, weight = panels(np.linspace(-REACH, REACH, intervals + 1), 5)
    return z, weight * density(z)

"""How far two intervals overlap when one is displaced and both widths vary: one axis of a landing.

With half widths u of the contact and v of the pad, both at or above what makes a width of 0, and the
displacement e, the length of the overlap is

    L = max(0, min(2 u, 2 v, u + v - |e|))

e does not depend on u and v, since edge errors and placements share no source. So with s = u + v

    P(L > l) = integral over s of  density(s) P(|e| < s - l) P(l / 2 < u < s - l / 2 | s)

in which both probabilities are differences of normal ones: one integral, over s, is left.
"""

import math
from dataclasses import dataclass

import numpy as np

from flowplan.engine.landing.normal import REACH, cumulative, density, panels
from flowplan.engine.sources import FloatArray

#: What does not vary at all varies by this share of the widths, so that steps are just very steep.
STEEP = 1e-9
_PANEL_NODES = 8
#: A step this many times narrower than the spread of s needs intervals of its own.
_NARROW = 0.3
_SMOOTH = np.array([-REACH, -6.0, -3.5, -1.25, 1.25, 3.5, 6.0, REACH])
#: Standard deviations about a step that get intervals of their own.
_AROUND = np.array([-6.0, 0.0, 6.0])
_MOST_AT_ONCE = 2_000_000


@dataclass(frozen=True, slots=True)
class Interval:
    """One axis of a landing; lengths in nm.

    Attributes
    ----------
    mean, sigma : float
        Of the displacement e.
    contact, pad : float
        Mean half widths u and v.
    var_contact, var_pad, covariance : float
        Their variances and covariance [nm^2].
    """

    mean: float
    sigma: float
    contact: float
    pad: float
    var_contact: float
    var_pad: float
    covariance: float

    @property
    def scale(self) -> float:
        """A length of the order of the widths, never 0."""
        return max(abs(self.contact) + abs(self.pad), 1e-6)

    @property
    def least(self) -> float:
        """The smallest standard deviation that is told from none."""
        return STEEP * self.scale

    @property
    def var_sum(self) -> float:
        """Variance of u + v."""
        return max(0.0, self.var_contact + self.var_pad + 2 * self.covariance)

    def middle(self) -> float:
        """Return the length of the overlap when nothing varies [nm]."""
        room = self.contact + self.pad - abs(self.mean)
        return max(0.0, min(2 * self.contact, 2 * self.pad, room))

    def lengths(self) -> FloatArray:
        """Return lengths, ascending from 0, between which the distribution of L is smooth and slow."""
        centres = (
            (2 * self.contact, 2 * math.sqrt(self.var_contact)),
            (2 * self.pad, 2 * math.sqrt(self.var_pad)),
            (self.contact + self.pad - abs(self.mean), math.hypot(math.sqrt(self.var_sum), self.sigma)),
        )
        reach = np.linspace(-REACH, REACH, 200)
        near = [centre + reach * max(sigma, 2 * self.least) for centre, sigma in centres]
        found = np.unique(np.concatenate(near))
        found = found[found > self.least]
        return np.concatenate([[0.0], found, [found[-1] + self.scale] if len(found) else [self.scale]])

    def exceeds(self, lengths: FloatArray, mean: FloatArray, sigma: float) -> FloatArray:
        """Return P(L > l) at displacements of several means.

        Parameters
        ----------
        lengths : ndarray, shape (n,)
            l, 0 or more [nm].
        mean : ndarray, shape (m,)
            Means of e [nm].
        sigma : float
            Standard deviation of e [nm].

        Returns
        -------
        ndarray, shape (m, n)
        """
        sigma = max(sigma, self.least)
        step = max(1, _MOST_AT_ONCE // (len(lengths) * (len(_SMOOTH) + 9) * _PANEL_NODES))
        parts = [
            self._exceeds(lengths[None, :], mean[i : i + step, None], sigma)
            for i in range(0, len(mean), step)
        ]
        return np.clip(np.concatenate(parts), 0.0, 1.0)

    def _exceeds(self, length: FloatArray, mean: FloatArray, sigma: float) -> FloatArray:
        """Return P(L > l), shape (m, n), for l of shape (1, n) and means of shape (m, 1)."""
        centre, spread = self.contact + self.pad, math.sqrt(self.var_sum)
        varies = spread > self.least
        slope = (self.var_contact + self.covariance) / self.var_sum if varies else 0.0
        rest = math.sqrt(max(0.0, self.var_contact - slope**2 * self.var_sum))
        rest = max(rest, self.least)
        if varies:
            s, weight = self._nodes(length, mean, sigma, slope, rest)
            weight = weight * density((s - centre) / spread) / spread
        else:
            s, weight = np.full((1, 1, 1), centre), np.ones((1, 1, 1))
        length, mean = length[..., None], mean[..., None]
        contact = self.contact + slope * (s - centre)
        widths = cumulative((contact - length / 2) / rest) + cumulative((s - contact - length / 2) / rest) - 1
        weight = weight * np.maximum(widths, 0.0)
        room = s - length
        hits = cumulative((room - mean) / sigma) - cumulative((-room - mean) / sigma)
        return np.asarray((weight * np.maximum(hits, 0.0)).sum(axis=-1))

    def _nodes(
        self, length: FloatArray, mean: FloatArray, sigma: float, slope: float, rest: float
    ) -> tuple[FloatArray, FloatArray]:
        """Return where s is looked at: from l on, and densely about each step of the integrand."""
        centre, spread = self.contact + self.pad, math.sqrt(self.var_sum)
        low, high = np.maximum(length, centre - REACH * spread)[..., None], centre + REACH * spread
        edges = [np.broadcast_to(centre + spread * _SMOOTH, (*length.shape, len(_SMOOTH)))]
        if sigma < _NARROW * spread:
            edges.append((length + np.abs(mean))[..., None] + sigma * _AROUND)
        base = self.contact - slope * centre
        for gain, at in ((slope, length / 2 - base), (1 - slope, length / 2 + base)):
            if abs(gain) > STEEP and rest < _NARROW * spread * abs(gain):
                edges.append((at / gain)[..., None] + rest / abs(gain) * _AROUND)
        shape = np.broadcast_shapes(*(e.shape[:-1] for e in edges))
        together = np.concatenate([np.broadcast_to(e, (*shape, e.shape[-1])) for e in edges], axis=-1)
        return panels(np.sort(np.clip(together, np.minimum(low, high), high), axis=-1), _PANEL_NODES)

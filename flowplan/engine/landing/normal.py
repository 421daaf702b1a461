"""The normal distribution on whole arrays, by interpolation; scipy stays unloaded."""

import math

import numpy as np

from flowplan.engine.sources import FloatArray

#: Beyond this many standard deviations nothing is left (below 1e-18).
REACH = 8.75
#: Steps of the table a standard deviation; a cubic about the nearest is then right to 1e-13.
_STEPS = 512

_X = np.linspace(-REACH, REACH, int(2 * REACH * _STEPS) + 1)
_VALUE = np.array([0.5 * math.erfc(-x / math.sqrt(2)) for x in _X])
_SLOPE = np.exp(-(_X**2) / 2) / math.sqrt(2 * math.pi)


def cumulative(x: FloatArray) -> FloatArray:
    """Return the probability that a standard normal lies below x, right to 1e-12.

    Parameters
    ----------
    x : ndarray
        Any shape; infinite values are allowed.
    """
    x = np.clip(x, -REACH, REACH)
    nearest = np.rint((x + REACH) * _STEPS).astype(np.int32)
    at = nearest / _STEPS - REACH
    t = x - at
    # Taylor's series: the derivatives of the density are -x, x^2 - 1, ... times the density
    return np.asarray(_VALUE[nearest] + _SLOPE[nearest] * t * (1 - t / 2 * (at - t / 3 * (at * at - 1))))


def density(x: FloatArray) -> FloatArray:
    """Return the standard normal density."""
    return np.asarray(np.exp(-(x**2) / 2) / math.sqrt(2 * math.pi))


def panels(edges: FloatArray, nodes: int) -> tuple[FloatArray, FloatArray]:
    """Return Gauss-Legendre nodes and weights on neighbouring intervals.

    Parameters
    ----------
    edges : ndarray, shape (..., n_edges)
        Edges of the intervals, ascending; an interval may be empty.
    nodes : int
        Nodes an interval.

    Returns
    -------
    tuple of ndarray, each of shape (..., (n_edges - 1) * nodes)
        Positions and weights.
    """
    t, weight = np.polynomial.legendre.leggauss(nodes)
    half = np.diff(edges, axis=-1)[..., None] / 2
    middle = (edges[..., :-1] + edges[..., 1:])[..., None] / 2
    shape = (*edges.shape[:-1], -1)
    return (middle + half * t).reshape(shape), (half * weight).reshape(shape)

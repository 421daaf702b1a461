"""The sites that can be the worst.

Every need is a convex function of position: offsets are affine, bounds and the linear sum are sums of
absolute values of affine functions, and the random part is the length of an affine vector. So a
margin is concave and its smallest value over a set of sites is taken at a corner of their hull.
"""

from itertools import pairwise

import numpy as np

from flowplan.engine.points import Sites, basis_at
from flowplan.engine.sources import FloatArray


def extreme_sites(sites: Sites) -> FloatArray:
    """Return the basis functions at the sites that can be the worst.

    Parameters
    ----------
    sites : Sites
        All sites, the same in every field.

    Returns
    -------
    ndarray, shape (n_basis, n_extreme)
        The corners of the field in every field whose centre is a corner of the hull of centres.
    """
    if sites.n_points == 1:
        return sites.basis
    centres = hull(sites.centres)
    corners = hull(sites.positions[: sites.n_points // sites.n_fields, 2:])
    positions = np.column_stack(
        [np.repeat(centres, len(corners), axis=0), np.tile(corners, (len(centres), 1))]
    )
    return basis_at(positions)


def hull(points: FloatArray) -> FloatArray:
    """Return the corners of the convex hull of points in a plane, shape (n, 2)."""
    ordered = np.unique(points, axis=0)
    if len(ordered) < 3:
        return ordered
    return np.array(_half(ordered)[:-1] + _half(ordered[::-1])[:-1])


def _half(ordered: FloatArray) -> list[FloatArray]:
    kept: list[FloatArray] = []
    for point in ordered:
        while len(kept) > 1 and _turns_right(kept[-2], kept[-1], point):
            kept.pop()
        kept.append(point)
    return kept


def _turns_right(a: FloatArray, b: FloatArray, c: FloatArray) -> bool:
    (first_x, first_y), (second_x, second_y) = (q - p for p, q in pairwise((a, b, c)))
    return bool(first_x * second_y - first_y * second_x <= 0)

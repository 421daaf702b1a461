"""The overlay error of every two layers, as one array, without an entry for each."""

from itertools import combinations_with_replacement

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.margin import margins_over_sites
from flowplan.engine.points import Sites, basis_at
from flowplan.engine.residual import Residuals, Row
from flowplan.engine.sources import FloatArray
from flowplan.model.base import Axis
from flowplan.model.pairs import Overlay

#: Layers taken together; neighbours inherit the same sources, so few modes differ within a block.
_BLOCK = 16


def overlay_matrix(engine: Engine, axis: Axis) -> FloatArray:
    """Return the largest overlay error of every two layers.

    Parameters
    ----------
    engine : Engine
        A placed flow.
    axis : {'x', 'y'}
        Axis of the overlay.

    Returns
    -------
    ndarray, shape (n_layers, n_layers)
        |offset| plus need on the flow's basis at the worst site [nm]; symmetric, 0 on the diagonal.

    Notes
    -----
    Every part of the error is a convex function of the four coordinates of a site, so its largest
    value lies at a corner of their hull; `outer_sites` are enough.
    """
    n = len(engine.flow.layers)
    sites = outer_sites(engine.sites)
    found = np.zeros((n, n))
    blocks = [np.arange(start, min(start + _BLOCK, n)) for start in range(0, n, _BLOCK)]
    for rows, columns in combinations_with_replacement(blocks, 2):
        modes = engine.placement.telling(axis, np.union1d(rows, columns) + 1)
        first, second = (part.reshape(-1) for part in np.meshgrid(rows, columns, indexing="ij"))
        overlay = engine.placement.overlay(axis, list(first + 1), list(second + 1), modes)
        kernel = engine.view(axis).kernel.narrowed(modes)
        worst = -margins_over_sites(_unjudged(overlay, axis), kernel, sites, engine.flow).min(axis=1)
        found[first, second] = found[second, first] = worst
    return found


def outer_sites(sites: Sites) -> Sites:
    """Return the field corners of the outermost fields of every row of fields."""
    x_mm, y_mm, u_mm, v_mm = sites.positions.T
    corner = (np.abs(u_mm) == np.abs(u_mm).max()) & (np.abs(v_mm) == np.abs(v_mm).max())
    reach = {float(y): float(np.abs(x_mm[y_mm == y]).max()) for y in np.unique(y_mm)}
    outermost = np.abs(x_mm) == np.array([reach[float(y)] for y in y_mm])
    positions = sites.positions[corner & outermost]
    return Sites(positions, basis_at(positions), 1)


def _unjudged(overlay: FloatArray, axis: Axis) -> Residuals:
    pair = Overlay(rule="overlay", between=("first", "second"))
    none = np.zeros(len(overlay))
    row = Row(pair, "first", "second", axis)
    return Residuals((row,) * len(overlay), overlay, np.zeros_like(overlay), none + np.nan, none)

"""The overlay error of every two layers, as one array, without an entry for each."""

from itertools import pairwise

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.margin import margins_over_sites
from flowplan.engine.parts import CHUNK
from flowplan.engine.points import Sites, basis_at
from flowplan.engine.residual import Residuals, Row
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import Axis
from flowplan.model.pairs import Overlay


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
    layers = tuple(engine.flow.layers)
    first, second = np.triu_indices(len(layers), 1)
    sites = outer_sites(engine.sites)
    kernel = engine.view(axis).kernel
    found = np.zeros((len(layers), len(layers)))
    step = max(1, CHUNK // max(1, kernel.table.size, sites.n_points))
    for low, high in pairwise([*range(0, len(first), step), len(first)]):
        a, b = first[low:high], second[low:high]
        res = _unjudged(engine, axis, a + 1, b + 1)
        worst = -margins_over_sites(res, kernel, sites, engine.flow).min(axis=1)
        found[a, b] = found[b, a] = worst
    return found


def outer_sites(sites: Sites) -> Sites:
    """Return the field corners of the outermost fields of every row of fields."""
    x_mm, y_mm, u_mm, v_mm = sites.positions.T
    corner = (np.abs(u_mm) == np.abs(u_mm).max()) & (np.abs(v_mm) == np.abs(v_mm).max())
    reach = {float(y): float(np.abs(x_mm[y_mm == y]).max()) for y in np.unique(y_mm)}
    outermost = np.abs(x_mm) == np.array([reach[float(y)] for y in y_mm])
    positions = sites.positions[corner & outermost]
    return Sites(positions, basis_at(positions), 1)


def _unjudged(engine: Engine, axis: Axis, first: IntArray, second: IntArray) -> Residuals:
    overlay = engine.placement.overlay(axis, list(first), list(second))
    pair = Overlay(rule="overlay", between=("first", "second"))
    return Residuals(
        (Row(pair, "first", "second", axis),) * len(overlay),
        overlay,
        np.zeros_like(overlay),
        np.full(len(overlay), np.nan),
        np.zeros(len(overlay)),
    )

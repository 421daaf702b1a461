"""The signed displacement that known offsets give a layer at any point."""

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.points import basis_at
from flowplan.model.base import AXES, WAFER
from tests.support.flows import Data, flow_of


def displacement(data: Data, layer: str, positions: list[tuple[float, float, float, float]]) -> np.ndarray:
    """Return a layer's (dx, dy) [nm] at points (X, Y, x, y) [mm], shape (n_points, 2); offsets only."""
    engine = Engine.of(flow_of(data))
    rows = [engine.placement.index[WAFER]], [engine.placement.index[layer]]
    basis = basis_at(np.array(positions, dtype=float))
    along = []
    for axis in AXES:
        overlay = engine.placement.overlay(axis, *rows)
        along.append((engine.view(axis).kernel.offset_form(overlay) @ basis)[0])
    return np.column_stack(along)

"""A flow of one alignment, and what a fit to marks is from first principles, without the engine's code."""

from typing import Any

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.points import basis_at
from flowplan.model.base import AXES
from tests.support.flows import Data, bare_flow, flow_of, mask, overlay_pair

#: 60 mm of usable radius with fields of 13 mm by 11 mm: small, yet with a clear edge.
GEOMETRY = {
    "wafer": {"diameter": "130 mm", "edge_exclusion": "5 mm"},
    "field": {"x": "13 mm", "y": "11 mm"},
}
#: Number of parameters of each model.
SIZES = {"shift": 2, "rigid": 3, "rigid+scale": 4, "linear": 6}


def alignment(sites: Any, model: str = "rigid", per_mark: Any = 30, **more: Any) -> Data:
    """An alignment from sites, a list of places in mm or a ring as (count, radius in mm)."""
    if isinstance(sites, tuple):
        given: Any = {"ring": {"count": sites[0], "radius": f"{sites[1]!r} mm"}}
    else:
        given = [{"x": f"{x!r} mm", "y": f"{y!r} mm"} for x, y in sites]
    return {"per_mark": per_mark, "sites": given, "model": model, **more}


def one_reading(read: Any, **more: Any) -> Data:
    """B reads A's marks so; nothing else is wrong. Quoted and judged at one sigma."""
    flow = bare_flow([mask("A"), mask("B", [{"mask": "A", "alignment": read}])], [overlay_pair("A", "B")])
    return flow | GEOMETRY | more


def regressors(model: str, places: Any) -> tuple[np.ndarray, np.ndarray]:
    """Rows of the fit for displacements along x and along y at places [mm], parameters as in the model.

    shift (tx, ty); rotation th: (-th y, th x); magnification m: (m x, m y); linear: tx, ty, sx, sy, th and
    skew phi: (-phi y, 0).
    """
    x, y = np.asarray(places, dtype=float).reshape(-1, 2).T
    one, none = np.ones_like(x), np.zeros_like(x)
    along_x = {"tx": one, "ty": none, "sx": x, "sy": none, "m": x, "th": -y, "phi": -y}
    along_y = {"tx": none, "ty": one, "sx": none, "sy": y, "m": y, "th": x, "phi": none}
    names = {
        "shift": ("tx", "ty"),
        "rigid": ("tx", "ty", "th"),
        "rigid+scale": ("tx", "ty", "m", "th"),
        "linear": ("tx", "ty", "sx", "sy", "th", "phi"),
    }[model]
    return np.column_stack([along_x[n] for n in names]), np.column_stack([along_y[n] for n in names])


def design(model: str, places: Any) -> np.ndarray:
    """All readings: along x, then along y."""
    return np.vstack(regressors(model, places))


def ring(count: int, radius: float) -> np.ndarray:
    turn = 2 * np.pi * np.arange(count) / count
    return radius * np.column_stack([np.cos(turn), np.sin(turn)])


def placed_covariance(data: Data, points: Any, *, over: str = "wafer", layer: str = "B") -> np.ndarray:
    """Covariance of a layer's displacements (x then y at each point, in mm) as the engine carries it.

    Read off the sources themselves, so that what x and y share counts as shared. Sizes at one sigma.
    """
    engine = Engine.of(flow_of(data))
    place = np.asarray(points, dtype=float).reshape(-1, 2)
    none = np.zeros_like(place)
    basis = basis_at(np.hstack([none, place] if over == "field" else [place, none]))
    index, sources = engine.placement.index, engine.placement.sources
    moves = np.zeros((2 * len(place), len(sources)))
    for k, axis in enumerate(AXES):
        table = engine.placement.modes[axis]
        (row,) = engine.placement.overlay(axis, [index["A"]], [index[layer]])
        for mode, amount in enumerate(row):
            start = k * len(place)
            moves[start : start + len(place), table.source[mode]] += amount * basis[table.basis[mode]]
    kinds = {source.kind for source in sources}
    assert kinds <= {"random"}, kinds
    return moves @ moves.T

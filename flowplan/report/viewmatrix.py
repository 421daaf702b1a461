"""The overlay of every two layers: x below the diagonal, y above it."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.matrix import overlay_matrix
from flowplan.engine.results import Verdict
from flowplan.report.viewbase import Base, LayerName

#: Shades of the cells, the largest error in the last.
SHADES = 5


@dataclass(frozen=True, slots=True)
class Cell:
    """One cell; `look` is its shade and, where a pair is judged, its verdict."""

    text: str
    look: str


@dataclass(frozen=True, slots=True)
class MatrixRow:
    """One layer against all others."""

    layer: LayerName
    cells: tuple[Cell, ...]


@dataclass(frozen=True, slots=True)
class MatrixView:
    """The matrix; `size` tells the style sheet how small it must print."""

    layers: tuple[LayerName, ...]
    rows: tuple[MatrixRow, ...]
    largest: str
    size: str


def matrix_view(base: Base) -> MatrixView:
    """Return the matrix of all layers in process order."""
    engine = base.result.engine
    errors = {axis: overlay_matrix(engine, axis) for axis in ("x", "y")}
    both = np.tril(errors["x"]) + np.triu(errors["y"])
    layers = tuple(base.names[name] for name in base.result.flow.layers)
    largest = float(both.max(initial=0.0))
    judged = _judged(base)
    shade = np.minimum((both / (largest or 1.0) * SHADES).astype(int), SHADES - 1)
    rows = tuple(
        MatrixRow(layer, tuple(_cell(base, both, shade, judged, i, j) for j in range(len(layers))))
        for i, layer in enumerate(layers)
    )
    return MatrixView(layers, rows, base.length(largest), _size(len(layers)))


def _size(n: int) -> str:
    return next((name for name, most in (("small", 14), ("middle", 28), ("large", 52)) if n <= most), "huge")


def _judged(base: Base) -> dict[tuple[int, int], Verdict]:
    """Return the worst verdict at each cell that a pair of the flow judges."""
    order: dict[Verdict, int] = {"unjudged": 0, "pass": 1, "tight": 2, "fail": 3}
    place = {name: i for i, name in enumerate(base.result.flow.layers)}
    found: dict[tuple[int, int], Verdict] = {}
    for entry in base.result.entries:
        low, high = sorted(place[name] for name in entry.layers)
        cell = (high, low) if entry.axis == "x" else (low, high)
        found[cell] = max(found.get(cell, "unjudged"), entry.verdict, key=order.__getitem__)
    return found


def _cell(
    base: Base,
    both: np.ndarray[tuple[int, int], np.dtype[np.float64]],
    shade: np.ndarray[tuple[int, int], np.dtype[np.int64]],
    judged: dict[tuple[int, int], Verdict],
    i: int,
    j: int,
) -> Cell:
    if i == j:
        return Cell("", "d")
    verdict = judged.get((i, j))
    look = f"s{shade[i, j]}" + (f" {verdict}" if verdict and verdict != "unjudged" else "")
    return Cell(base.length(float(both[i, j])), look)

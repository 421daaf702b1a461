"""Sums of rows by place, for maps: a grid of cells over the places that were measured."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray


@dataclass(slots=True)
class Cells:
    """A grid of cells with the sum of z in each.

    Attributes
    ----------
    low, step : ndarray, shape (2,)
        Centre of the first cell, and the pitch [mm].
    shape : tuple of int
        Cells along x and y.
    sums : ndarray, shape (n_cells, n_columns + 2)
        Sum of z, and of the place weighted by the rows.
    """

    low: FloatArray
    step: FloatArray
    shape: tuple[int, int]
    sums: FloatArray

    @classmethod
    def over(cls, places: FloatArray, most: int) -> "Cells":
        """Return empty cells over places (n_places, 2) [mm], at most so many along an axis.

        Places on a regular grid get a cell each where the grid is not finer than that.
        """
        low, high = places.min(axis=0), places.max(axis=0)
        shape, step = [], np.ones(2)
        for axis in (0, 1):
            distinct = np.unique(np.round(places[:, axis], 6))
            pitch = float(np.diff(distinct).min()) if len(distinct) > 1 else 1.0
            count = min(most, round((high[axis] - low[axis]) / pitch) + 1)
            shape.append(count)
            step[axis] = (high[axis] - low[axis]) / (count - 1) if count > 1 else 1.0
        return cls(low, step, (shape[0], shape[1]), np.zeros((shape[0] * shape[1], 9)))

    def add(self, places: FloatArray, sums: FloatArray) -> None:
        """Add sums of z at places; a place outside counts in the nearest cell."""
        column, row = (
            np.clip(np.rint((places[:, axis] - self.low[axis]) / self.step[axis]), 0, self.shape[axis] - 1)
            for axis in (0, 1)
        )
        cell = (row * self.shape[0] + column).astype(np.int64)
        n = len(self.sums)
        for j in range(sums.shape[1]):
            self.sums[:, j] += np.bincount(cell, sums[:, j], n)
        for axis in (0, 1):
            self.sums[:, sums.shape[1] + axis] += np.bincount(cell, sums[:, 0] * places[:, axis], n)

"""All judged margins of a flow as plain arrays, for judging many small changes of it."""

from dataclasses import dataclass, replace

import numpy as np

from flowplan.engine.margin import margins_over_sites
from flowplan.engine.parts import Kernel
from flowplan.engine.placement import Placement
from flowplan.engine.points import Sites, sites_of
from flowplan.engine.propose.worst_case import extreme_sites
from flowplan.engine.residual import Residuals, Row, drawn_and_keep, residuals, rows_of
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import AXES, Axis
from flowplan.model.flow import Flow

#: A margin this small against its own terms is 0; the rest is rounding.
_DUST = 1e-12
#: A margin that changes by less than this share of what was drawn stays as it is.
_SAME = 1e-9
#: ... or, where next to nothing was drawn, of this length [nm].
_LEAST = 1.0


@dataclass(frozen=True, slots=True)
class Board:
    """The judged pairs of a flow, both axes, in file order.

    Attributes
    ----------
    flow : Flow
        The flow.
    rows : tuple of Row
        Each judged pair of layers on each axis.
    places : dict of axis to ndarray of int
        Which rows lie on an axis.
    drawn, keep : ndarray, shape (n_rows,)
        Drawn dimension or limit, and what must remain [nm].
    sites : Sites
        The sites that can be the worst.
    """

    flow: Flow
    rows: tuple[Row, ...]
    places: dict[Axis, IntArray]
    drawn: FloatArray
    keep: FloatArray
    sites: Sites

    @classmethod
    def of(cls, flow: Flow) -> "Board":
        """Return the board of a flow."""
        every = [(row, drawn_and_keep(flow, row)) for row in rows_of(flow, flow.pairs)]
        judged = [(row, lengths) for row, lengths in every if not np.isnan(lengths[0])]
        rows = tuple(row for row, _ in judged)
        drawn, keep = np.array([lengths for _, lengths in judged]).reshape(-1, 2).T
        places = {a: np.array([i for i, r in enumerate(rows) if r.axis == a], dtype=np.int64) for a in AXES}
        return cls(flow, rows, places, drawn, keep, _extreme(sites_of(flow)))

    def of_edited(self, flow: Flow) -> "Board":
        """Return the same rows in an edited flow; its pairs, drawn values and fields must be the same."""
        return replace(self, flow=flow)

    def residuals(self, placement: Placement, axis: Axis) -> Residuals:
        """Return the residuals of the rows on an axis, in the order of `places`."""
        return residuals(self.flow, placement, tuple(self.rows[i] for i in self.places[axis]), axis)

    def margins(self, placement: Placement) -> FloatArray:
        """Return the margin of every row at its worst site, shape (n_rows,) [nm]."""
        found = np.zeros(len(self.rows))
        for axis in AXES:
            kernel = Kernel.of(placement.modes[axis], placement.sources, self.flow.sigma)
            found[self.places[axis]] = self.worst_margins(self.residuals(placement, axis), kernel)
        return found

    def worst_margins(self, res: Residuals, kernel: Kernel) -> FloatArray:
        """Return the smallest margin of residuals over the sites, shape (n_rows,) [nm]."""
        if not len(res.drawn):
            return np.zeros(0)
        return np.asarray(margins_over_sites(res, kernel, self.sites, self.flow).min(axis=1))

    def settled(self, margins: FloatArray, rows: IntArray | None = None) -> FloatArray:
        """Return margins of all or some rows, with what is nothing but rounding set to 0."""
        which = slice(None) if rows is None else rows
        terms = 2 * (self.drawn[which] + np.abs(self.keep[which])) + np.abs(margins)
        return np.where(np.abs(margins) <= _DUST * terms, 0.0, margins)

    def failing(self, margins: FloatArray) -> int:
        """Return how many rows fail."""
        return int((self.settled(margins) < 0).sum())

    def worst(self, margins: FloatArray) -> float:
        """Return the smallest margin [nm]; infinite where nothing is judged."""
        return float(self.settled(margins).min(initial=np.inf))

    @property
    def grain(self) -> FloatArray:
        """Changes of a margin smaller than this count as none, shape (n_rows,) [nm]."""
        return _SAME * np.maximum(self.drawn + np.abs(self.keep), _LEAST)


def _extreme(sites: Sites) -> Sites:
    """Return the sites that can be the worst, as sites of one field."""
    basis = extreme_sites(sites)
    _, x, y, wafer_x, wafer_y = basis
    return Sites(np.column_stack([wafer_x - x, wafer_y - y, x, y]), basis, 1)

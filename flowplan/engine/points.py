"""The sites at which a margin is taken, and the basis functions of position there."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, whole_fields

#: Corners, edge middles and centre of a field, as fractions of half its size.
_SITES = tuple((u, v) for v in (-1.0, 0.0, 1.0) for u in (-1.0, 0.0, 1.0))


@dataclass(frozen=True, slots=True)
class Point:
    """A place: the field's centre on the wafer and the site in the field.

    Attributes
    ----------
    X, Y : float
        The field's centre [mm].
    x, y : float
        The site from the field's centre [mm].
    """

    X: float
    Y: float
    x: float
    y: float


@dataclass(frozen=True, slots=True)
class Sites:
    """All sites of all whole fields, field by field.

    Attributes
    ----------
    positions : ndarray, shape (n_points, 4)
        Columns X, Y, x, y [mm].
    basis : ndarray, shape (n_basis, n_points)
        1, x, y, X + x, Y + y at every site [1 or mm].
    n_fields : int
        Number of fields; each has the same number of sites.
    """

    positions: FloatArray
    basis: FloatArray
    n_fields: int

    @property
    def n_points(self) -> int:
        """Number of sites."""
        return len(self.positions)

    @property
    def centres(self) -> FloatArray:
        """Centres of the fields [mm], shape (n_fields, 2)."""
        return self.positions[:: self.n_points // self.n_fields, :2]

    def point(self, index: int) -> Point:
        """Return one site."""
        return Point(*(float(v) for v in self.positions[index]))


def sites_of(flow: Flow) -> Sites:
    """Return the sites of a flow.

    Parameters
    ----------
    flow : Flow
        A checked flow.

    Returns
    -------
    Sites
        3 x 3 in every whole field when the flow has shapes, else the wafer's centre alone, since
        nothing then depends on position.
    """
    if not flow.shapes:
        origin = np.zeros((1, 4))
        return Sites(origin, basis_at(origin), 1)
    width, height = field_size(flow)
    centres = np.array(whole_fields(flow), dtype=np.float64).reshape(-1, 2)
    offsets = np.array(_SITES) * (width / 2, height / 2)
    positions = np.column_stack(
        [np.repeat(centres, len(offsets), axis=0), np.tile(offsets, (len(centres), 1))]
    )
    return Sites(positions, basis_at(positions), len(centres))


def basis_at(positions: FloatArray) -> FloatArray:
    """Return the basis functions at positions.

    Parameters
    ----------
    positions : ndarray, shape (n_points, 4)
        Columns X, Y, x, y [mm].

    Returns
    -------
    ndarray, shape (n_basis, n_points)
        1, x, y, X + x, Y + y.
    """
    wafer_x, wafer_y, x, y = positions.T
    return np.stack([np.ones_like(x), x, y, wafer_x + x, wafer_y + y])

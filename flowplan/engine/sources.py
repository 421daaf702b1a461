"""Independent sources and how each one moves a layer.

A source is one independent scalar, taken at its quoted size. Along each axis it moves a layer by

    amount * (1, x, y, X + x, Y + y)[basis]

so every shape is an affine function of position. One (source, basis) on one axis is a *mode*, and a
placement is an array of amounts over modes. Layers that inherit the same source hold the same mode,
so what both share cancels by plain subtraction, to exactly 0.
"""

import math
from collections.abc import Hashable
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from flowplan.model.base import AXES, Axis
from flowplan.model.terms import SHAPE_ACTION, Kind, Level, Shape
from flowplan.model.varies import rarer

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

#: Basis functions of position: constant, field x, field y, wafer x, wafer y (field centre + site).
N_BASIS = 5
_CONSTANT = 0
_WAFER_SHIFT = 2


def action(shape: Shape, over: str, axis: Axis) -> tuple[int, int] | None:
    """Return (basis index, sign) of a shape along an axis, or None where it does nothing.

    Parameters
    ----------
    shape : str
        One of the five shapes.
    over : {'field', 'wafer'}
        Where the shape is centred.
    axis : {'x', 'y'}
        Axis of the displacement.
    """
    found = SHAPE_ACTION[shape][axis]
    return None if found is None else (basis_over(found[0], over), found[1])


def basis_over(which: int, over: str) -> int:
    """Return the basis function that 1, x or y (0, 1, 2) is over the field or over the wafer."""
    return which if which == _CONSTANT or over == "field" else which + _WAFER_SHIFT


def deviation(kind: Kind, sigma: float) -> float:
    """Return the standard deviation of a random or uniform part quoted at size 1.

    Parameters
    ----------
    kind : {'random', 'uniform', 'bound', 'offset'}
        How the size is meant.
    sigma : float
        Standard deviations at which random sizes are quoted.

    Returns
    -------
    float
        0 for a bound or an offset, which do not vary.

    Notes
    -----
    A uniform error of half-width a has the standard deviation a / sqrt(3) (JCGM 100:2008, 4.3.7).
    """
    return {"random": 1 / sigma, "uniform": 1 / math.sqrt(3), "bound": 0.0, "offset": 0.0}[kind]


@dataclass(frozen=True, slots=True)
class Source:
    """One independent scalar.

    Attributes
    ----------
    name : str
        The term's name, or what is read.
    of : str
        The mask, tool or feature that it belongs to.
    kind, shape : str
        As in the flow file.
    size : float
        The size as quoted [nm, urad or ppm]; the largest where several places quote it.
    varies : {'mask', 'lot', 'wafer', 'field'}
        How often it is redrawn; the rarest where several places quote it. No margin depends on it.
    """

    name: str
    of: str
    kind: Kind
    shape: Shape
    size: float
    varies: Level = "field"


@dataclass(frozen=True, slots=True)
class ModeTable:
    """The modes of one axis, sorted by source.

    Attributes
    ----------
    source : ndarray of int, shape (n_modes,)
        Index of each mode's source.
    basis : ndarray of int, shape (n_modes,)
        Index of each mode's basis function of position.
    starts : ndarray of int, shape (n_active,)
        Where each source's modes begin.
    active : ndarray of int, shape (n_active,)
        The sources that have a mode on this axis.
    """

    source: IntArray
    basis: IntArray
    starts: IntArray
    active: IntArray

    @property
    def size(self) -> int:
        """Number of modes."""
        return len(self.source)


@dataclass(slots=True)
class SourceBook:
    """Hands out sources and modes while a flow is walked through; equal keys are one source.

    With `apart`, the place in the file that quotes a size is part of the key.
    """

    apart: bool = False
    sources: list[Source] = field(default_factory=list)
    _by_key: dict[Hashable, int] = field(default_factory=dict)
    _modes: dict[Axis, dict[tuple[int, int], int]] = field(
        default_factory=lambda: {axis: {} for axis in AXES}
    )

    @property
    def keys(self) -> tuple[Hashable, ...]:
        """The key of every source."""
        return tuple(self._by_key)

    def source(self, key: Hashable, source: Source, place: Hashable) -> int:
        """Return the index of the source with this key; the largest size quoted for it counts."""
        if self.apart:
            key = key, place
        index = self._by_key.setdefault(key, len(self.sources))
        if index == len(self.sources):
            self.sources.append(source)
            return index
        known = self.sources[index]
        varies = rarer(known.varies, source.varies)
        larger = source if abs(source.size) > abs(known.size) else known
        self.sources[index] = larger if larger.varies == varies else replace(larger, varies=varies)
        return index

    def mode(self, axis: Axis, source: int, basis: int) -> int:
        """Return the index of a mode, new or known."""
        modes = self._modes[axis]
        return modes.setdefault((source, basis), len(modes))

    def tables(self) -> tuple[dict[Axis, ModeTable], dict[Axis, IntArray]]:
        """Return the modes of each axis sorted by source, and each mode's new index."""
        tables, places = {}, {}
        for axis in AXES:
            pairs = np.array(list(self._modes[axis]), dtype=np.int64).reshape(-1, 2)
            order = np.lexsort((pairs[:, 1], pairs[:, 0]))
            place = np.empty(len(order), dtype=np.int64)
            place[order] = np.arange(len(order))
            source, basis = pairs[order, 0], pairs[order, 1]
            active, starts = np.unique(source, return_index=True)
            tables[axis] = ModeTable(source, basis, starts.astype(np.int64), active)
            places[axis] = place
        return tables, places

"""What a least-squares fit to marks gets wrong, as independent sources with shapes.

With the design A (a row a reading, a column a parameter p) and readings of variance s^2 the fit's
errors have the covariance

    C = A^+ diag(s^2) A^+T          A^+ = (A^T A)^-1 A^T, every mark counts alike

which for equal s is s^2 (A^T A)^-1. Where s differs between x and y, C is the sum of two parts, one for
the readings along each axis. Each part is factored, C = L L^T with L lower triangular (Cholesky, rows of
no variance left out), so that column k of L is one independent scalar that moves parameter k and those
after it. Positions are taken from the marks' centroid: the shift there is independent of all the rest.

Root-sum-squares do not depend on how C is factored. The basis `linear` adds deviations source by source
and takes the factors as they stand.
"""

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from flowplan.engine.sources import FloatArray, deviation
from flowplan.model.base import AXES, Axis
from flowplan.model.marksites import MarkSites, Parameter, centred, design
from flowplan.model.terms import SHAPE_ACTION

#: Entries of a factor this small against its largest are rounding.
_DUST = 1e-12


@dataclass(frozen=True, slots=True)
class Scalar:
    """One independent error of a fit.

    Attributes
    ----------
    leads : Parameter
        The first parameter that it moves.
    name : str
        After that parameter, and after the readings where those along each axis move it apart.
    readings : {'x', 'y'}
        Along which axis the marks were read whose `per_mark` it scales with; x where both are equal.
    size : float
        Its part of that parameter, at readings of 1 nm [nm, urad or ppm].
    amounts : dict of axis to ndarray, shape (3,)
        What it moves at readings of 1 nm, as (1, x, y) [nm, nm per mm, nm per mm].
    """

    leads: Parameter
    name: str
    readings: Axis
    size: float
    amounts: dict[Axis, FloatArray]


def covariance(sites: MarkSites, file_unit: str, variance: tuple[float, float]) -> FloatArray:
    """Return the covariance of the fitted parameters, about the centre of the wafer or field.

    Parameters
    ----------
    sites : MarkSites
        Marks that fix their model.
    file_unit : str
        Unit of bare lengths.
    variance : (float, float)
        Of reading one mark along x and along y [nm^2].

    Returns
    -------
    ndarray, shape (n_parameters, n_parameters)
        In the order of `sites.parameters` [nm, urad and ppm].
    """
    rows = np.array(design(sites.parameters, sites.places(file_unit)))
    inverse = np.linalg.pinv(rows)
    return np.asarray(inverse * np.repeat(variance, len(rows) // 2) @ inverse.T)


@lru_cache(maxsize=256)  # one alignment serves many readings
def scalars(sites: MarkSites, file_unit: str, *, alike: bool) -> tuple[Scalar, ...]:
    """Return the independent errors of a fit, at readings of 1 nm.

    Parameters
    ----------
    sites : MarkSites
        Marks that fix their model.
    file_unit : str
        Unit of bare lengths.
    alike : bool
        Whether marks are read equally well along x and along y; else each axis has scalars of its own.
    """
    centroid, spread, places = centred(sites.places(file_unit))
    inverse = np.linalg.pinv(np.array(design(sites.parameters, places)))
    half = inverse.shape[1] // 2
    parts: tuple[tuple[Axis, FloatArray], ...] = (
        (("x", inverse),) if alike else (("x", inverse[:, :half]), ("y", inverse[:, half:]))
    )
    in_mm = np.array([1.0 if p.shape == "shift" else spread for p in sites.parameters])
    found = []
    for readings, part in parts:
        for lead, column in _factor(part @ part.T):
            moved = column / in_mm
            amounts = {axis: _affine(sites.parameters, moved, axis, centroid) for axis in AXES}
            leads = sites.parameters[lead]
            found.append(Scalar(leads, leads.name, readings, float(moved[lead]), amounts))
    times = Counter(scalar.name for scalar in found)
    return tuple(
        replace(s, name=f"{s.name} from {s.readings} readings") if times[s.name] > 1 else s for s in found
    )


def _factor(form: FloatArray) -> Iterator[tuple[int, FloatArray]]:
    """Yield (leading row, column) of L with L L^T = `form`, which may have no full rank."""
    left = form.copy()
    floor = _DUST * float(np.diag(form).max())
    for lead in range(len(form)):
        if left[lead, lead] <= floor:
            continue
        column = left[:, lead] / np.sqrt(left[lead, lead])
        column[:lead] = 0.0
        column[np.abs(column) <= _DUST * np.abs(column).max()] = 0.0
        left -= np.outer(column, column)
        yield lead, column


def _affine(
    parameters: Sequence[Parameter], moved: FloatArray, axis: Axis, centroid: tuple[float, float]
) -> FloatArray:
    """Return the displacement along an axis as amounts of (1, x, y), the parameters about the centroid."""
    amounts = np.zeros(3)
    for parameter, value in zip(parameters, moved, strict=True):
        act = SHAPE_ACTION[parameter.shape][axis] if axis in parameter.axes else None
        if act is None:
            continue
        basis, sign = act
        amounts[basis] += sign * value
        if basis:
            amounts[0] -= sign * value * centroid[basis - 1]
    amounts.setflags(write=False)
    return amounts


def mirrored(amounts: FloatArray, axis: Axis) -> FloatArray:
    """Return amounts of (1, x, y) of an exposure on the back seen from the front (SEMI M20)."""
    return amounts * ((-1.0, 1.0, -1.0) if axis == "x" else (1.0, -1.0, 1.0))


def deviations(sites: MarkSites, file_unit: str, sigma: float, places: FloatArray) -> dict[Axis, FloatArray]:
    """Return one standard deviation of the alignment's error at places.

    Parameters
    ----------
    sites : MarkSites
        The alignment.
    file_unit : str
        Unit of bare lengths.
    sigma : float
        Standard deviations at which random sizes are quoted.
    places : ndarray, shape (n, 2)
        From the centre of the wafer or field [mm].

    Returns
    -------
    dict of axis to ndarray, shape (n,)
        [nm].
    """
    read = read_variance(sites, file_unit, sigma)
    basis = np.stack([np.ones(len(places)), *places.T])
    found = {axis: np.zeros(len(places)) for axis in AXES}
    for scalar in scalars(sites, file_unit, alike=read["x"] == read["y"]):
        for axis in AXES:
            found[axis] += read[scalar.readings] * (scalar.amounts[axis] @ basis) ** 2
    return {axis: np.sqrt(variance) for axis, variance in found.items()}


def read_variance(sites: MarkSites, file_unit: str, sigma: float) -> dict[Axis, float]:
    """Return the variance of reading one mark along each axis [nm^2]."""
    return {
        axis: sum(
            (size.on(axis).in_base(file_unit) * deviation(kind, sigma)) ** 2
            for kind, size in sites.per_mark.parts()
        )
        for axis in AXES
    }

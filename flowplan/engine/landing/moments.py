"""What the engine's sources say about a landing at every site: displacements and widths, exactly.

The displacement e of the contact against the pad is their overlay; the edges are those of the two
layers. A shape such as rotation moves both axes by one scalar, so e along x and along y are correlated;
edges are quoted for each axis and layer, so they share sources only within an axis, where a self-aligned
layer takes over its parent's.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from flowplan.engine.landing.overlap import Interval
from flowplan.engine.parts import CHUNK, Kernel
from flowplan.engine.placement import Placement
from flowplan.engine.points import Sites
from flowplan.engine.sources import FloatArray
from flowplan.model.base import AXES, Axis


@dataclass(frozen=True, slots=True)
class Edges:
    """Edge errors of contact and pad along one axis, outward positive, both edges alike.

    Attributes
    ----------
    offset, bound : tuple of float
        Of the contact and of the pad [nm].
    variance : ndarray, shape (2, 2)
        Covariance of the two [nm^2].
    """

    offset: tuple[float, float]
    bound: tuple[float, float]
    variance: FloatArray


@dataclass(frozen=True, slots=True)
class Moments:
    """Displacements at every site.

    Attributes
    ----------
    mean, bound, variance : dict of axis to ndarray, shape (n_points,)
        Known part, bounds' sum and variance of e [nm, nm, nm^2].
    covariance : ndarray, shape (n_points,)
        Of e along x and y [nm^2].
    edges : dict of axis to Edges
        Edge errors.
    shaped : bool
        Whether anything depends on the site.
    """

    mean: dict[Axis, FloatArray]
    bound: dict[Axis, FloatArray]
    variance: dict[Axis, FloatArray]
    covariance: FloatArray
    edges: dict[Axis, Edges]
    shaped: bool

    def interval(self, axis: Axis, site: int, halves: tuple[float, float], *, worst: int = 0) -> Interval:
        """Return one axis at one site.

        Parameters
        ----------
        axis : {'x', 'y'}
            The axis.
        site : int
            The site.
        halves : tuple of float
            Drawn half widths of contact and pad [nm].
        worst : {-1, 0, 1}
            Where the bounds push the contact; the widths' bounds shrink both. 0 leaves bounds out.
        """
        edges, on = self.edges[axis], abs(worst)
        contact, pad = (
            half + offset - on * bound
            for half, offset, bound in zip(halves, edges.offset, edges.bound, strict=True)
        )
        mean = float(self.mean[axis][site] + worst * self.bound[axis][site])
        (var_contact, covariance), (_, var_pad) = edges.variance.tolist()
        sigma = float(np.sqrt(self.variance[axis][site]))
        return Interval(mean, sigma, contact, pad, var_contact, var_pad, covariance)


def moments_of(
    placement: Placement, kernels: dict[Axis, Kernel], sites: Sites, pad: str, contact: str
) -> Moments:
    """Return the displacements of a contact against a pad at every site.

    Parameters
    ----------
    placement : Placement
        Every layer's place.
    kernels : dict of axis to Kernel
        The axes' modes.
    sites : Sites
        The sites.
    pad, contact : str
        The layers.

    Notes
    -----
    Amounts are summed within each source before anything is squared. A uniform part counts by its
    variance, as in the closed form.
    """
    first, second = placement.index[pad], placement.index[contact]
    overlay = {axis: placement.overlay(axis, [first], [second]) for axis in AXES}
    parts = [_at_sites(placement, kernels, overlay, basis) for basis in _blocks(placement, sites)]
    return Moments(
        {axis: np.concatenate([part[0][axis] for part in parts]) for axis in AXES},
        {axis: np.concatenate([part[1][axis] for part in parts]) for axis in AXES},
        {axis: np.concatenate([part[2][axis] for part in parts]) for axis in AXES},
        np.concatenate([p[3] for p in parts]),
        {axis: _edges(kernels[axis], placement.edge[axis][[second, first]]) for axis in AXES},
        any((overlay[axis] != 0)[:, kernels[axis].table.basis != 0].any() for axis in AXES),
    )


def _blocks(placement: Placement, sites: Sites) -> Iterator[FloatArray]:
    step = max(1, CHUNK // max(1, len(placement.sources)))
    for start in range(0, sites.n_points, step):
        yield sites.basis[:, start : start + step]


_Part = tuple[dict[Axis, FloatArray], dict[Axis, FloatArray], dict[Axis, FloatArray], FloatArray]


def _at_sites(
    placement: Placement, kernels: dict[Axis, Kernel], overlay: dict[Axis, FloatArray], basis: FloatArray
) -> _Part:
    mean, bound, variance = {}, {}, {}
    varying = np.zeros((2, basis.shape[1], len(placement.sources)))
    for i, axis in enumerate(AXES):
        kernel = kernels[axis]
        amounts = kernel.at_points(np.repeat(overlay[axis], basis.shape[1], axis=0), basis)
        starts = kernel.table.starts
        mean[axis] = amounts @ kernel.offset[starts]
        bound[axis] = np.abs(amounts) @ kernel.bound[starts]
        varying[i][:, kernel.table.active] = amounts * kernel.sigma[starts]
        variance[axis] = (varying[i] ** 2).sum(axis=1)
    return mean, bound, variance, np.einsum("ps,ps->p", varying[0], varying[1])


def _edges(kernel: Kernel, amounts: FloatArray) -> Edges:
    """Return the edge errors of two rows, contact and pad."""
    by_source, starts = kernel.by_source(amounts), kernel.table.starts
    offset, bound = by_source @ kernel.offset[starts], np.abs(by_source) @ kernel.bound[starts]
    varying = by_source * kernel.sigma[starts]
    return Edges(
        (float(offset[0]), float(offset[1])), (float(bound[0]), float(bound[1])), varying @ varying.T
    )

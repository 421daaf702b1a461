"""What the plan says of a measured overlay, at the very places where it was measured."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.sources import FloatArray
from flowplan.model.base import Axis

#: Measured overlay is quoted at three standard deviations, whatever the flow's own confidence.
SIGMAS = 3.0


@dataclass(frozen=True, slots=True)
class Planned:
    """The plan of one reading along one axis.

    Attributes
    ----------
    offset, bound : float
        Mean of the known offsets over the measured places, signed, and the largest sum of bounds [nm].
    variance : float
        Mean over the measured places of the variance of the random parts [nm^2].
    offset_variance : float
        How much the known offsets vary over the measured places [nm^2].
    drawn_once : float
        What is in `variance` but moves the mean of all rows instead of spreading them, since it is drawn
        once for the mask set [nm^2].
    """

    offset: float
    bound: float
    variance: float
    offset_variance: float
    drawn_once: float

    @property
    def three_sigma(self) -> float:
        """Three standard deviations over wafers and places [nm]."""
        return SIGMAS * float(np.sqrt(self.variance + self.offset_variance))

    @property
    def spread(self) -> float:
        """Variance over wafers and places of one mask set [nm^2]."""
        return max(self.variance + self.offset_variance - self.drawn_once, 0.0)

    @property
    def mean_plus_3sigma(self) -> float:
        """|offset| + bound + three sigma [nm]: what |mean| + 3 sigma should not exceed."""
        return abs(self.offset) + self.bound + self.three_sigma


def planned(engine: Engine, mask: str, reference: str, axis: Axis, moments: FloatArray) -> Planned:
    """Return what the plan says of a mask measured against a reference.

    Parameters
    ----------
    engine : Engine
        The placed flow.
    mask, reference : str
        Layers of the flow.
    axis : {'x', 'y'}
        The axis.
    moments : ndarray, shape (n_basis, n_basis)
        Mean over the measured places of the products of the basis functions.

    Returns
    -------
    Planned
        The mean square over places needs only these moments, since a variance is a quadratic form of
        the basis functions.
    """
    placement, kernel = engine.placement, engine.view(axis).kernel
    row = placement.overlay(axis, [placement.index[reference]], [placement.index[mask]])
    form, offset = kernel.gram(row)[0], kernel.offset_form(row)[0]
    mean = moments[0]
    spread = moments - np.outer(mean, mean)
    once = np.array([placement.sources[i].varies == "mask" for i in kernel.table.source], dtype=np.float64)
    form_once = kernel.gram(row * once)[0]
    bound = kernel.absolute_sum(row, kernel.bound, engine.sites.basis)
    return Planned(
        offset=float(offset @ mean),
        bound=float(bound.max()),
        variance=float(max(np.sum(form * moments), 0.0)),
        offset_variance=float(max(offset @ spread @ offset, 0.0)),
        drawn_once=float(mean @ form_once @ mean),
    )

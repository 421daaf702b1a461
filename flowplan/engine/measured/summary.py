"""Measured overlay, reading by reading: spread, fit, split of the variance, and the plan."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.measured.fit import Fit, linear_fit
from flowplan.engine.measured.nested import Split, mean_error, split_variance
from flowplan.engine.measured.planned import SIGMAS, Planned, planned
from flowplan.engine.measured.tally import Ledger, Outlier, Tally
from flowplan.engine.sources import N_BASIS
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow


@dataclass(frozen=True, slots=True)
class AxisFigures:
    """One reading along one axis.

    Attributes
    ----------
    mean, sigma : float
        Mean and standard deviation of all rows that count [nm]; the latter NaN for one row.
    mean_error : float or None
        Standard error of the mean, wafers and lots being what is drawn [nm]; None for one wafer.
    residual : float
        Standard deviation of what the linear fit leaves [nm]; NaN without degrees of freedom.
    split : Split
        The variance of what the fit leaves, by level.
    plan : Planned or None
        What the flow says; None where it does not know both layers.
    """

    mean: float
    sigma: float
    mean_error: float | None
    residual: float
    split: Split
    plan: Planned | None

    @property
    def three_sigma(self) -> float:
        """Three standard deviations [nm]."""
        return SIGMAS * self.sigma

    @property
    def mean_plus_3sigma(self) -> float:
        """|mean| + 3 sigma [nm]."""
        return abs(self.mean) + self.three_sigma


@dataclass(frozen=True, slots=True)
class MeasuredReading:
    """A mask measured against a reference.

    Attributes
    ----------
    mask, reference : str
        The layers as the data name them.
    axes : dict of axis to AxisFigures
        Spread, split and plan.
    fit : Fit
        The linear fit.
    tally : Tally
        The sums that all of this comes from.
    """

    mask: str
    reference: str
    axes: dict[Axis, AxisFigures]
    fit: Fit
    tally: Tally

    @property
    def name(self) -> str:
        """``CONTACT on GATE``."""
        return f"{self.mask} on {self.reference}"


@dataclass(frozen=True, slots=True)
class Measured:
    """A whole file of measured overlay beside a flow.

    Attributes
    ----------
    flow : Flow
        The plan.
    readings : tuple of MeasuredReading
        In process order, those that the flow does not know last.
    outliers : tuple of Outlier
        The farthest rows that do not count; their `reading` is an index into `readings`.
    limit : float or None
        Robust standard deviations beyond which a row does not count; None when all do.
    """

    flow: Flow
    readings: tuple[MeasuredReading, ...]
    outliers: tuple[Outlier, ...]
    limit: float | None

    @property
    def n_outliers(self) -> int:
        """Rows that do not count because they lie too far off."""
        return sum(reading.tally.n_outliers for reading in self.readings)

    @property
    def unknown(self) -> tuple[str, ...]:
        """Names in the data that are no layers of the flow."""
        named = (name for reading in self.readings for name in (reading.mask, reading.reference))
        return tuple(dict.fromkeys(name for name in named if name not in (WAFER, *self.flow.layers)))


def summarise(engine: Engine, ledger: Ledger, names: Sequence[tuple[str, str]]) -> Measured:
    """Return what the sums say.

    Parameters
    ----------
    engine : Engine
        The placed flow.
    ledger : Ledger
        The sums of all rows.
    names : sequence of (str, str)
        Mask and reference of each reading number.

    Returns
    -------
    Measured
        Readings of which every row is an outlier are left out.
    """
    order = {layer: i for i, layer in enumerate(engine.flow.layers)}
    numbers = sorted(
        (number for number, tally in ledger.tallies.items() if tally.n),
        key=lambda number: [order.get(name, len(order)) for name in names[number]],
    )
    place = {number: i for i, number in enumerate(numbers)}
    readings = tuple(_reading(engine, *names[number], ledger.tallies[number]) for number in numbers)
    shown = tuple(
        Outlier(place[o.reading], o.row, o.overlay, o.ratio) for o in ledger.outliers if o.reading in place
    )
    return Measured(engine.flow, readings, shown, ledger.limit)


def _reading(engine: Engine, mask: str, reference: str, tally: Tally) -> MeasuredReading:
    fit = linear_fit(tally.rows, tally.pattern)
    known = {mask, reference} <= set(engine.placement.index) and mask != reference
    moments = tally.rows[:N_BASIS, :N_BASIS] / tally.n
    axes: dict[Axis, AxisFigures] = {}
    for number, axis in enumerate(AXES):
        mean, sigma = _spread(tally, number)
        split = split_variance(tally, fit.coefficients[:, number], number)
        axes[axis] = AxisFigures(
            mean,
            sigma,
            mean_error(tally, split),
            float(fit.residual[number]),
            split,
            planned(engine, mask, reference, axis, moments) if known else None,
        )
    return MeasuredReading(mask, reference, axes, fit, tally)


def _spread(tally: Tally, axis: int) -> tuple[float, float]:
    """Return mean and standard deviation of the overlay itself, the pattern put back."""
    n = tally.n
    weights = np.zeros(len(tally.rows))
    weights[:N_BASIS] = tally.pattern[:, axis]
    weights[N_BASIS + axis] = 1.0
    total = tally.rows[0]
    centred = tally.rows - np.outer(total, total) / n
    square = max(float(weights @ centred @ weights), 0.0)
    return float(weights @ total) / n, float(np.sqrt(square / (n - 1))) if n > 1 else float("nan")

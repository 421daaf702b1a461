"""What a simulation returns: frozen records, lengths in nm."""

from dataclasses import dataclass
from typing import Literal

from flowplan.engine.results import Entry
from flowplan.engine.simulate.tally import Histogram
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.flow import Flow

Bounds = Literal["worst", "uniform"]
Interval = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Rare:
    """An importance-sampled fail fraction.

    Attributes
    ----------
    fail : float
        The estimate.
    relative_error : float or None
        Its standard error as a share of it; None where it is 0.
    """

    fail: float
    relative_error: float | None


@dataclass(frozen=True, slots=True)
class PairOutcome:
    """One judged row, at the worst point that its margin was taken at.

    Attributes
    ----------
    entry : Entry
        The closed form's entry.
    fails : int
        Samples in which it did not hold on one side or the other.
    fail : float
        Their share.
    interval : tuple of float
        Its 95 % interval.
    rare : Rare
        The importance-sampled estimate.
    histogram : Histogram
        The residual of the worse side.
    """

    entry: Entry
    fails: int
    fail: float
    interval: Interval
    rare: Rare
    histogram: Histogram


@dataclass(frozen=True, slots=True)
class FieldYield:
    """Fields that hold: every judged pair, at every site.

    Attributes
    ----------
    centres : ndarray, shape (n_fields, 2)
        Centres of the wafer's whole fields [mm].
    good : ndarray, shape (n_fields,)
        Share of the wafers on which each field holds.
    per_wafer : ndarray of int, shape (n_mask_sets, n_lots, n_wafers)
        Good fields of each simulated wafer.
    share : float
        Share of fields that hold.
    interval : tuple of float
        Its 95 % interval, from the spread between mask sets.
    spread : dict of str to float
        Standard deviation of the good fields per wafer between mask sets, between lots of one mask
        set and between wafers of one lot, under the names ``mask``, ``lot`` and ``wafer``.
    """

    centres: FloatArray
    good: FloatArray
    per_wafer: IntArray
    share: float
    interval: Interval
    spread: dict[str, float]

    @property
    def mean_per_wafer(self) -> float:
        """Mean good fields per wafer."""
        return self.share * len(self.centres)


@dataclass(frozen=True, slots=True)
class Simulation:
    """A simulated flow.

    Attributes
    ----------
    flow : Flow
        The flow.
    samples, seed : int
        How many draws of every source, from which seed.
    bounds : {'worst', 'uniform'}
        How bounds counted.
    pairs : tuple of PairOutcome
        The judged rows in file order.
    joint_yield : float
        Share of the samples in which every judged row held, each at its own worst point. A sample is
        one draw of every source, as in one field that had the worst of everything.
    joint_yield_interval : tuple of float
        Its 95 % interval.
    product_yield : float
        The product of the rows' own yields: what independent pairs would give.
    rare : Rare
        Importance-sampled share of the samples in which some row fails.
    fields : FieldYield
        Yield by field and wafer.
    """

    flow: Flow
    samples: int
    seed: int
    bounds: Bounds
    pairs: tuple[PairOutcome, ...]
    joint_yield: float
    joint_yield_interval: Interval
    product_yield: float
    rare: Rare
    fields: FieldYield

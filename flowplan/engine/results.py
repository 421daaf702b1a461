"""What an analysis returns: frozen records, lengths in nm."""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from flowplan.engine.graph import Chain
from flowplan.engine.points import Point
from flowplan.engine.sources import FloatArray, IntArray, Source
from flowplan.model.base import Axis
from flowplan.model.flow import Basis
from flowplan.model.pairs import AxisPair

Verdict = Literal["pass", "tight", "fail", "unjudged"]
VERDICTS: tuple[Verdict, ...] = ("pass", "tight", "fail", "unjudged")


@dataclass(frozen=True, slots=True)
class Parts:
    """An error in its three parts [nm]; `random` is at the flow's confidence."""

    offset: float
    bound: float
    random: float


@dataclass(frozen=True, slots=True)
class ByBasis:
    """One figure [nm] by each way of adding bounds and random parts."""

    mixed: float
    rss: float
    linear: float

    def on(self, basis: Basis) -> float:
        """Return the figure for one basis."""
        return float(getattr(self, basis))


@dataclass(frozen=True, slots=True)
class SourceRow:
    """One source's part in a residual.

    Attributes
    ----------
    source : Source
        The source.
    coefficient : float
        Signed change of the residual per unit of the size as quoted
        [nm per nm, urad or ppm], on the worse side.
    contribution : float
        coefficient times size [nm].
    share : float
        Share of the variance; the shares of a residual that varies add up to 1.
    """

    source: Source
    coefficient: float
    contribution: float
    share: float


@dataclass(frozen=True, slots=True)
class Budget:
    """A residual broken into its sources; rows are made when asked for.

    Attributes
    ----------
    book : tuple of Source
        All sources of the flow.
    index : ndarray of int, shape (n,)
        The sources that take part.
    amount : ndarray, shape (n,)
        Signed contributions at the quoted sizes [nm].
    variance : ndarray, shape (n,)
        Variance of each [nm^2]; 0 for bounds and offsets.
    """

    book: tuple[Source, ...]
    index: IntArray
    amount: FloatArray
    variance: FloatArray

    def rows(self) -> tuple[SourceRow, ...]:
        """Return the sources, the largest contribution first."""
        total = float(self.variance.sum())
        share = self.variance / total if total else self.variance
        order = np.lexsort((self.index, -np.abs(self.amount), -share))
        return tuple(self._row(int(i), float(share[i])) for i in order)

    def _row(self, i: int, share: float) -> SourceRow:
        source, amount = self.book[int(self.index[i])], float(self.amount[i])
        return SourceRow(source, amount / source.size, amount, share)


@dataclass(frozen=True, slots=True)
class Entry:
    """The margin of one pair of layers on one axis, at its worst point.

    Attributes
    ----------
    pair : AxisPair
        The pair in the flow.
    layers : tuple of str
        The two layers, split layers expanded.
    axis : {'x', 'y'}
        The axis.
    chain : Chain
        How the layers are connected.
    drawn : float or None
        The drawn dimension or the limit [nm]; None for an overlay without a limit.
    keep : float
        What must remain [nm].
    nominal : float or None
        Drawn plus the offset of the worse side [nm].
    residual : Parts
        The residual's parts, edges included; the offset is the worse side's.
    overlay : Parts
        The overlay's part alone; the offset is D_second - D_first.
    need, margin : ByBasis, and ByBasis or None
        What the errors take, and what is left [nm].
    verdict : {'pass', 'tight', 'fail', 'unjudged'}
        On the flow's basis.
    cpk, fail_probability : float or None
        Process capability index of the worse side (may be infinite) and probability of failure.
    point : Point or None
        The worst point; None where the margin is the same everywhere.
    chain_rss : float or None
        What a plain root-sum-square along the chain would have said [nm], to be compared with
        ``overlay.random``; None where references are averaged. Taken at `point`, or at the first
        site where the margin itself is the same everywhere.
    budget : Budget
        The residual's sources.
    """

    pair: AxisPair
    layers: tuple[str, str]
    axis: Axis
    chain: Chain
    drawn: float | None
    keep: float
    nominal: float | None
    residual: Parts
    overlay: Parts
    need: ByBasis
    margin: ByBasis | None
    verdict: Verdict
    cpk: float | None
    fail_probability: float | None
    point: Point | None
    chain_rss: float | None
    budget: Budget

    @property
    def sources(self) -> tuple[SourceRow, ...]:
        """The residual's sources, the largest share first."""
        return self.budget.rows()

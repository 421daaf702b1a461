"""The engine's front: one flow in, every margin out."""

from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from flowplan.engine.graph import AlignmentGraph
from flowplan.engine.landing import LandingEntry, LandingView, landing_entries
from flowplan.engine.margin import AxisView, entries_of, margins_over_sites
from flowplan.engine.parts import Kernel
from flowplan.engine.placement import Placement, place
from flowplan.engine.points import Sites, sites_of
from flowplan.engine.residual import Row, residuals, rows_of
from flowplan.engine.results import VERDICTS, Entry, Verdict
from flowplan.engine.sources import FloatArray
from flowplan.model.base import AXES, Axis
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing
from flowplan.model.pairs import AnyPair, Overlay

Progress = Callable[[int, int], None]
_BATCH = 512


@dataclass(frozen=True, slots=True)
class Engine:
    """A placed flow, ready for questions.

    Attributes
    ----------
    flow : Flow
        The flow.
    placement : Placement
        Every layer's place.
    graph : AlignmentGraph
        Who inherits from whom.
    sites : Sites
        Where margins are taken.
    """

    flow: Flow
    placement: Placement
    graph: AlignmentGraph
    sites: Sites
    _kernels: dict[Axis, Kernel]

    @classmethod
    def of(cls, flow: Flow) -> "Engine":
        """Place a checked flow."""
        placement = place(flow)
        kernels = {axis: Kernel.of(placement.modes[axis], placement.sources, flow.sigma) for axis in AXES}
        return cls(flow, placement, AlignmentGraph(flow), sites_of(flow), kernels)

    def view(self, axis: Axis) -> AxisView:
        """Return what the rows of one axis need."""
        return AxisView(self.flow, axis, self.placement, self._kernels[axis], self.sites, self.graph)

    def entries(
        self, pairs: Iterable[AnyPair] | None = None, progress: Progress | None = None
    ) -> tuple[Entry, ...]:
        """Return the margins of pairs in their order.

        Parameters
        ----------
        pairs : iterable of AnyPair, optional
            The flow's own pairs by default.
        progress : callable, optional
            Called with (rows done, rows in all).

        Returns
        -------
        tuple of Entry
            One entry per pair, layers of a split layer and axis.
        """
        rows = rows_of(self.flow, self.flow.pairs if pairs is None else pairs)
        found: dict[int, Entry] = {}
        for axis in AXES:
            chosen = [i for i, row in enumerate(rows) if row.axis == axis]
            for start in range(0, len(chosen), _BATCH):
                batch = chosen[start : start + _BATCH]
                res = residuals(self.flow, self.placement, tuple(rows[i] for i in batch), axis)
                found.update(zip(batch, entries_of(self.view(axis), res), strict=True))
                if progress:
                    progress(len(found), len(rows))
        return tuple(found[i] for i in range(len(rows)))

    def landings(self, pairs: Iterable[AnyPair] | None = None) -> tuple[LandingEntry, ...]:
        """Return the landing pairs among some pairs, by default the flow's own, in their order."""
        view = LandingView(self.flow, self.placement, self._kernels, self.sites, self.graph)
        wanted = self.flow.pairs if pairs is None else pairs
        return tuple(
            entry for pair in wanted if isinstance(pair, Landing) for entry in landing_entries(view, pair)
        )

    def margin_map(self, entries: Sequence[Entry]) -> FloatArray:
        """Return the margins of entries of one axis at every site.

        Parameters
        ----------
        entries : sequence of Entry
            Entries of this engine, all on one axis.

        Returns
        -------
        ndarray, shape (n_entries, n_points)
            Margins on the flow's basis [nm]; without a limit, minus the error.

        Raises
        ------
        ValueError
            When the entries lie on different axes.
        """
        if not entries:
            return np.zeros((0, self.sites.n_points))
        axis = entries[0].axis
        if any(e.axis != axis for e in entries):
            msg = "entries of one axis are wanted"
            raise ValueError(msg)
        rows = tuple(Row(e.pair, *e.layers, e.axis) for e in entries)
        res = residuals(self.flow, self.placement, rows, axis)
        return margins_over_sites(res, self._kernels[axis], self.sites, self.flow)


def every_pair(flow: Flow) -> tuple[Overlay, ...]:
    """Return an overlay pair, without a limit, of every two layers of a flow."""
    return tuple(
        Overlay(rule="overlay", name=f"{second} on {first}", between=(first, second))
        for first, second in combinations(flow.layers, 2)
    )


@dataclass(frozen=True, slots=True)
class Result:
    """The margins of a flow.

    Attributes
    ----------
    engine : Engine
        The placed flow, for further questions.
    entries : tuple of Entry
        What is judged along an axis, in file order.
    landings : tuple of LandingEntry
        What is judged by its landed area, in file order.
    """

    engine: Engine
    entries: tuple[Entry, ...]
    landings: tuple[LandingEntry, ...] = ()

    @property
    def flow(self) -> Flow:
        """The flow that was analysed."""
        return self.engine.flow

    @property
    def checks(self) -> tuple[Entry | LandingEntry, ...]:
        """Everything that is judged, of both kinds, in file order."""
        if not self.landings:
            return self.entries
        place = {pair.name: i for i, pair in enumerate(self.flow.pairs)}
        every: tuple[Entry | LandingEntry, ...] = (*self.entries, *self.landings)
        return tuple(sorted(every, key=lambda e: place.get(e.pair.name, len(place))))

    @property
    def counts(self) -> dict[Verdict, int]:
        """How many entries got each verdict."""
        counted = Counter(e.verdict for e in self.checks)
        return {verdict: counted[verdict] for verdict in VERDICTS}

    @property
    def worst(self) -> Entry | None:
        """The judged entry with the smallest margin on the flow's basis; the first on a tie."""
        judged = [e for e in self.entries if e.margin is not None]
        return min(judged, key=self.margin, default=None)

    def margin(self, entry: Entry) -> float:
        """Return an entry's margin on the flow's basis [nm]; NaN where nothing is judged."""
        return float("nan") if entry.margin is None else entry.margin.on(self.flow.basis)


def analyse(flow: Flow, pairs: Iterable[AnyPair] | None = None, progress: Progress | None = None) -> Result:
    """Work out every margin of a flow.

    Parameters
    ----------
    flow : Flow
        A checked flow, as `flowplan.load` returns it.
    pairs : iterable of AnyPair, optional
        Other pairs than the flow's own, for example `every_pair(flow)`.
    progress : callable, optional
        Called with (rows done, rows in all).

    Returns
    -------
    Result
        The entries in file order.
    """
    engine = Engine.of(flow)
    wanted = flow.pairs if pairs is None else tuple(pairs)
    return Result(engine, engine.entries(wanted, progress), engine.landings(wanted))

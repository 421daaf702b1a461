"""A flow simulated: the sources that the closed form uses, drawn, and every judged pair looked at."""

import math
import os
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine, Result
from flowplan.engine.results import Entry
from flowplan.engine.simulate.fields import FieldModel, Layout, simulate_fields
from flowplan.engine.simulate.forms import field_forms, judged_entries, pair_forms
from flowplan.engine.simulate.intervals import wilson
from flowplan.engine.simulate.pairs import PairModel, simulate_pairs
from flowplan.engine.simulate.rare import rare_pairs, rare_union
from flowplan.engine.simulate.results import Bounds, FieldYield, PairOutcome, Rare, Simulation
from flowplan.engine.simulate.tally import Histogram, PairTally
from flowplan.engine.simulate.threads import plain_products
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.geometry import field_size, whole_fields

__all__ = ["Bounds", "FieldYield", "Options", "PairOutcome", "Rare", "Simulation", "simulate"]

#: Called with (done, all, what is being done).
Progress = Callable[[int, int, str], None]


@dataclass(frozen=True, slots=True)
class Options:
    """How a flow is simulated.

    Attributes
    ----------
    samples : int
        Draws of every source, at least 1.
    seed : int
        Not negative; the same seed gives the same answer on any number of threads.
    bounds : {'worst', 'uniform'}
        A bound at its worst sign for each pair and side, or drawn uniformly.
    threads : int or None
        Threads at work; as many as there are processors when None.
    """

    samples: int = 100_000
    seed: int = 1
    bounds: Bounds = "worst"
    threads: int | None = None


def simulate(result: Result, options: Options | None = None, progress: Progress | None = None) -> Simulation:
    """Simulate a flow.

    Parameters
    ----------
    result : Result
        The analysis of the flow; each pair is looked at where its margin was taken.
    options : Options, optional
        How.
    progress : callable, optional
        Called with (done, all, what is being done), from any thread.

    Returns
    -------
    Simulation
        Memory does not grow with the samples: only counts are kept.

    Raises
    ------
    UsageError
        FP602, where the flow judges no pair.
    """
    options = options or Options()
    entries = judged_entries(result)
    if not entries:
        hint = "add `pairs:` with a drawn size or a limit"
        raise UsageError([Diagnostic("FP602", "no pair is judged: there is nothing to simulate", hint)])
    with plain_products():
        return _Run(result, entries, options, progress).simulation()


class _Run:
    """One simulation, step by step."""

    def __init__(
        self, result: Result, entries: tuple[Entry, ...], options: Options, progress: Progress | None
    ) -> None:
        self._result, self._entries, self._options, self._progress = result, entries, options, progress
        self._threads = options.threads or os.cpu_count() or 1
        self._bounds_vary = options.bounds == "uniform"

    def simulation(self) -> Simulation:
        """Return everything that was found."""
        flow, asked = self._result.flow, self._options
        forms = pair_forms(self._result, self._entries, bounds_vary=self._bounds_vary)
        sources = self._result.engine.placement.sources
        model = PairModel.of(forms, sources, flow.sigma, bounds_vary=self._bounds_vary)
        tally = simulate_pairs(model, asked.samples, asked.seed, self._threads, self._step("pairs"))
        rare = rare_pairs(model, asked.seed, self._threads, self._step("rare failures"))
        outcomes = self._outcomes(model, tally, rare)
        return Simulation(
            flow=flow,
            samples=asked.samples,
            seed=asked.seed,
            bounds=asked.bounds,
            pairs=outcomes,
            joint_yield=tally.good / asked.samples,
            joint_yield_interval=wilson(tally.good, asked.samples),
            product_yield=math.prod(1 - outcome.fail for outcome in outcomes),
            rare=rare_union(model, rare, asked.seed, self._threads),
            fields=self._fields(),
        )

    def _step(self, what: str) -> Callable[[int, int], None] | None:
        progress = self._progress
        return (lambda done, total: progress(done, total, what)) if progress else None

    def _fields(self) -> FieldYield:
        result, asked = self._result, self._options
        model = FieldModel(
            field_forms(result.engine, self._entries, bounds_vary=self._bounds_vary),
            layout_of(result.engine),
            result.engine.placement.sources,
            result.flow.sigma,
            bounds_vary=self._bounds_vary,
        )
        return simulate_fields(model, asked.samples, asked.seed, self._threads, self._step("wafers"))

    def _outcomes(self, model: PairModel, tally: PairTally, rare: list[Rare]) -> tuple[PairOutcome, ...]:
        """Return the rows in file order; the histograms show the residual, what must be kept included."""
        ranges, samples = model.ranges(), self._options.samples
        found = {}
        for i, entry in enumerate(self._entries):
            fails = int(tally.fails[i])
            low = float(ranges.low[i]) + entry.keep
            histogram = Histogram(low, float(ranges.width[i]), tally.counts[i])
            interval = wilson(fails, samples)
            found[id(entry)] = PairOutcome(entry, fails, fails / samples, interval, rare[i], histogram)
        return tuple(found[id(entry)] for entry in self._result.entries if id(entry) in found)


def layout_of(engine: Engine) -> Layout:
    """Return the wafer's whole fields; one at the centre where the flow does not say how large they are."""
    width, height = field_size(engine.flow)
    centres = whole_fields(engine.flow) or ((0.0, 0.0),)
    half = (width / 2, height / 2) if engine.sites.n_points > 1 else (0.0, 0.0)
    return Layout(np.array(centres, dtype=np.float64), half)

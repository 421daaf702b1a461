"""A flow simulated: the sources that the closed form uses, drawn, and every judged pair looked at."""

import math
import os
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Result
from flowplan.engine.results import Entry
from flowplan.engine.simulate.fields import FieldModel, Layout, simulate_fields
from flowplan.engine.simulate.forms import field_forms, judged_entries, pair_forms
from flowplan.engine.simulate.intervals import wilson
from flowplan.engine.simulate.pairs import PairModel, simulate_pairs
from flowplan.engine.simulate.rare import rare_pairs, rare_union
from flowplan.engine.simulate.results import Bounds, PairOutcome, Rare, Simulation
from flowplan.engine.simulate.tally import Histogram, PairTally
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, whole_fields

__all__ = ["Bounds", "Options", "PairOutcome", "Rare", "Simulation", "simulate"]

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
    threads = options.threads or os.cpu_count() or 1
    entries = judged_entries(result)
    if not entries:
        hint = "add `pairs:` with a drawn size or a limit"
        raise UsageError([Diagnostic("FP602", "no pair is judged: there is nothing to simulate", hint)])
    bounds_vary = options.bounds == "uniform"
    flow, sources = result.flow, result.engine.placement.sources

    def step(what: str) -> Callable[[int, int], None] | None:
        return (lambda done, total: progress(done, total, what)) if progress else None

    forms = pair_forms(result, entries, bounds_vary=bounds_vary)
    model = PairModel.of(forms, sources, flow.sigma, bounds_vary=bounds_vary)
    tally = simulate_pairs(model, options.samples, options.seed, threads, step("pairs"))
    rare = rare_pairs(model, options.seed, threads, step("rare failures"))
    fields = FieldModel(
        field_forms(result.engine, entries, bounds_vary=bounds_vary),
        layout_of(flow),
        sources,
        flow.sigma,
        bounds_vary=bounds_vary,
    )
    outcomes = _outcomes(result, entries, model, tally, rare, options.samples)
    return Simulation(
        flow=flow,
        samples=options.samples,
        seed=options.seed,
        bounds=options.bounds,
        pairs=outcomes,
        joint_yield=tally.good / options.samples,
        joint_yield_interval=wilson(tally.good, options.samples),
        product_yield=math.prod(1 - outcome.fail for outcome in outcomes),
        rare=rare_union(model, rare, options.seed, threads),
        fields=simulate_fields(fields, options.samples, options.seed, threads, step("wafers")),
    )


def layout_of(flow: Flow) -> Layout:
    """Return the wafer's whole fields; one at the centre where the flow does not say how large they are."""
    width, height = field_size(flow)
    centres = whole_fields(flow) or ((0.0, 0.0),)
    half = (width / 2, height / 2) if flow.shapes else (0.0, 0.0)
    return Layout(np.array(centres, dtype=np.float64), half)


def _outcomes(
    result: Result,
    entries: tuple[Entry, ...],
    model: PairModel,
    tally: PairTally,
    rare: list[Rare],
    samples: int,
) -> tuple[PairOutcome, ...]:
    """Return the rows in file order; the histograms show the residual, what must be kept included."""
    ranges = model.ranges()
    found = {}
    for i, entry in enumerate(entries):
        fails = int(tally.fails[i])
        low = float(ranges.low[i]) + entry.keep
        histogram = Histogram(low, float(ranges.width[i]), tally.counts[i])
        interval = wilson(fails, samples)
        found[id(entry)] = PairOutcome(entry, fails, fails / samples, interval, rare[i], histogram)
    return tuple(found[id(entry)] for entry in result.entries if id(entry) in found)

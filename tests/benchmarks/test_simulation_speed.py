"""Simulation of the 45-mask flow, as a ratio against only drawing the same normals with numpy."""

import time

import numpy as np
import pytest

import flowplan
from flowplan.engine.analysis import analyse
from flowplan.engine.simulate import Options, simulate
from flowplan.engine.simulate.draws import BLOCK
from flowplan.files.resources import resource_folder

SAMPLES = 200 * BLOCK
TURNS = 3


@pytest.fixture(scope="module")
def result():
    return analyse(flowplan.load(str(resource_folder("flows") / "logic_backend.yaml")))


def only_draw(n_sources):
    """Draw every normal source in blocks of the same size, into memory that is there already."""
    random = np.random.default_rng(1)
    block = np.empty((n_sources, BLOCK))
    for _ in range(SAMPLES // BLOCK):
        random.standard_normal(out=block)


def seconds(work):
    begin = time.process_time()
    work()
    return time.process_time() - begin


def test_simulating_costs_at_most_twice_the_drawing(benchmark, result):
    """Everything: counted and rare fractions, histograms, wafers; processor time on one thread."""
    n_sources = sum(s.kind == "random" for s in result.engine.placement.sources)

    def in_turns():
        pairs = [
            (
                seconds(lambda: simulate(result, Options(SAMPLES, threads=1))),
                seconds(lambda: only_draw(n_sources)),
            )
            for _ in range(TURNS)
        ]
        return [min(times) for times in zip(*pairs, strict=True)]

    simulation, drawing = benchmark.pedantic(in_turns)
    benchmark.extra_info |= {"times the drawing": round(simulation / drawing, 2), "sources": n_sources}
    assert simulation / drawing <= 2

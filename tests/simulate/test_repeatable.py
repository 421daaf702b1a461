"""The same seed gives the same answer on any number of threads, in memory that does not grow."""

import tracemalloc

import numpy as np
import pytest

import flowplan
from flowplan.engine.analysis import analyse
from flowplan.engine.simulate import Options, simulate
from flowplan.engine.simulate.draws import BLOCK, draws_of
from flowplan.engine.simulate.threads import spread
from flowplan.engine.sources import Source
from flowplan.files.resources import resource_folder
from flowplan.report.simulation import simulation_document


def result(name):
    return analyse(flowplan.load(str(resource_folder("flows") / name)))


def everything(found):
    counts = [p.histogram.counts.tolist() for p in found.pairs]
    return simulation_document(found), counts, found.fields.per_wafer.tolist(), found.fields.good.tolist()


def test_same_seed_same_answer_on_any_number_of_threads():
    flow = result("pressure_sensor.yaml")
    one, two, five = (
        everything(simulate(flow, Options(4 * BLOCK + 77, seed=3, threads=n))) for n in (1, 2, 5)
    )
    assert one == two == five


def test_another_seed_another_answer():
    flow = result("pressure_sensor.yaml")
    one, two = (everything(simulate(flow, Options(BLOCK, seed=seed, threads=1))) for seed in (3, 4))
    assert all(a != b for a, b in zip(one, two, strict=True))


def test_every_sample_is_counted_once():
    found = simulate(result("pressure_sensor.yaml"), Options(2 * BLOCK + 5, threads=2))
    assert {int(p.histogram.counts.sum()) for p in found.pairs} == {2 * BLOCK + 5}


def test_memory_does_not_grow_with_the_samples():
    flow = result("logic_backend.yaml")
    peaks = []
    for samples in (4 * BLOCK, 16 * BLOCK):
        tracemalloc.start()
        simulate(flow, Options(samples, threads=1))
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    assert peaks[1] <= 1.05 * peaks[0]
    assert peaks[1] <= 250e6


def test_a_fault_in_one_thread_ends_the_work():
    def work(done, block):
        done.append(block)
        if block == 3:
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        spread(10_000_000, list, work, 3)


def test_progress_counts_every_block():
    seen = []
    simulate(result("pressure_sensor.yaml"), Options(3 * BLOCK, threads=2), lambda *step: seen.append(step))
    assert [s for s in seen if s[2] == "pairs"] == [(1, 3, "pairs"), (2, 3, "pairs"), (3, 3, "pairs")]
    assert {what for _, _, what in seen} == {"pairs", "rare failures", "wafers"}


def test_normals_that_act_together_are_drawn_together():
    """Two proportional columns of one level become their root sum of squares; others stay."""
    sources = [
        *(
            Source(n, "A", "random", "shift", 1.0, v)
            for n, v in zip("abcd", ("lot", "lot", "lot", "field"), strict=True)
        ),
        Source("e", "A", "uniform", "shift", 1.0, "lot"),
    ]
    amounts = np.array([[3.0, -4.0, 1.0, 3.0, 3.0], [6.0, -8.0, 0.0, 6.0, 6.0]])
    draws = draws_of(amounts, sources, 1.0, bounds_vary=False)
    assert np.abs(draws.forms) == pytest.approx(np.array([[5, 1, 3, 3], [10, 0, 6, 6]]))
    assert (draws.n_normal, draws.level.tolist()) == (3, [1, 1, 3, 1])


def test_the_library_gives_the_same():
    path = str(resource_folder("flows") / "pressure_sensor.yaml")
    found = flowplan.analyse(flowplan.load(path)).simulate(samples=BLOCK, seed=3)
    assert everything(found) == everything(simulate(result("pressure_sensor.yaml"), Options(BLOCK, seed=3)))

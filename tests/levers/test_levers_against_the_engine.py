"""Every figure of a lever is what the engine gives for the edited flow."""

from pathlib import Path

import numpy as np
import pytest

import flowplan
from flowplan.engine.analysis import analyse
from flowplan.engine.levers import Lever, levers
from flowplan.model.edits import with_size
from flowplan.model.flow import Flow
from flowplan.model.paths import quoted_at
from tests.propose.flows import small_flow

FLOWS = Path(__file__).resolve().parents[2] / "flows"
#: Of the larger examples every so many sizes are put back, so that the test stays short.
EXAMPLES = {
    "cmos": 1, "ebeam_transistor": 1, "photonic": 1, "pressure_sensor": 2, "redistribution": 2,
    "logic_backend": 10,
}  # fmt: skip
#: Flows of which some pairs pass, so that sizes have limits.
SEEDS = [seed for seed in range(13, 36) if seed != 27]


def margins_of(flow: Flow) -> tuple[float, int, float]:
    """Worst margin, failing margins, smallest drawn value."""
    result = analyse(flow)
    judged = [e for e in result.entries if e.margin is not None]
    return (
        min(result.margin(e) for e in judged),
        result.counts["fail"],
        min(e.drawn for e in judged if e.drawn is not None),
    )


def resized(flow: Flow, lever: Lever, size: float) -> Flow:
    """The flow with a size changed at its dotted path."""
    quoted = quoted_at(flow, lever.quoted.path, lever.quoted.axis)
    return with_size(flow, quoted, quoted.quantity(size, flow.unit))


def without_failing_pairs(flow: Flow) -> Flow:
    """The flow with only the pairs that pass, so that sizes have limits."""
    failing = {e.pair.name for e in analyse(flow).entries if e.verdict == "fail"}
    return flow.model_copy(update={"pairs": tuple(p for p in flow.pairs if p.name not in failing)})


def assert_limit(flow: Flow, lever: Lever) -> None:
    """The largest value leaves a worst margin of 0, and a little more fails."""
    assert lever.largest is not None
    worst, failing, drawn = margins_of(resized(flow, lever, lever.largest))
    assert abs(worst) <= 1e-6 * drawn, lever
    assert failing == 0, lever
    worst, _, _ = margins_of(resized(flow, lever, lever.largest * 1.001 + 1e-6))
    assert worst < 0, lever


@pytest.mark.parametrize("name", EXAMPLES)
def test_largest_passing_size_leaves_a_margin_of_nothing(name):
    flow = flowplan.load(FLOWS / f"{name}.yaml")
    found = levers(flow).levers
    limited = [x for x in found if x.largest is not None and np.isfinite(x.largest)]
    for lever in limited:
        assert_limit(flow, lever)
    mended = without_failing_pairs(flow)
    every = [x for x in levers(mended).levers if not x.is_unlimited]
    assert len(every) > len(limited)
    for lever in every[:: EXAMPLES[name]]:
        assert_limit(mended, lever)


@pytest.mark.parametrize("name", EXAMPLES)
def test_gains_of_the_best_sizes(name):
    flow = flowplan.load(FLOWS / f"{name}.yaml")
    found = levers(flow)
    worst, failing, _ = margins_of(flow)
    assert (found.worst, found.failing) == (pytest.approx(worst, abs=1e-9), failing)
    for lever in found.levers[:4]:
        for gain, part in ((lever.halved, 0.5), (lever.removed, 0.0)):
            then, fail, _ = margins_of(resized(flow, lever, part * lever.value))
            assert (gain.worst, gain.failing) == (pytest.approx(then - worst, abs=1e-9), failing - fail)


@pytest.mark.parametrize("seed", range(12))
def test_every_figure_on_random_flows(seed):
    """Shared sources, averages, bounds, offsets, shapes, all three bases."""
    flow = small_flow(seed)
    found = levers(flow)
    worst, failing, _ = margins_of(flow)
    assert (found.worst, found.failing) == (pytest.approx(worst, abs=1e-9), failing)
    for lever in found.levers:
        for gain, part in ((lever.halved, 0.5), (lever.removed, 0.0)):
            then, fail, _ = margins_of(resized(flow, lever, part * lever.value))
            assert (gain.worst, gain.failing) == (pytest.approx(then - worst, abs=1e-9), failing - fail)
        step = (-1 if lever.value else 1) * 1e-5 * (lever.value or 1)
        then, _, _ = margins_of(resized(flow, lever, lever.value + step))
        assert lever.derivative == pytest.approx((then - worst) / step, rel=1e-3, abs=1e-3)


@pytest.mark.parametrize("seed", SEEDS)
def test_limits_on_random_flows(seed):
    flow = without_failing_pairs(small_flow(seed))
    for lever in levers(flow).levers:
        assert lever.largest is not None
        if lever.is_unlimited:
            assert margins_of(resized(flow, lever, 1e4 * (lever.value or 1)))[1] == 0
        else:
            assert_limit(flow, lever)

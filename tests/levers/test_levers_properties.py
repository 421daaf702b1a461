"""What holds of the levers of every flow."""

import math

import pytest
from hypothesis import given, settings

from flowplan.engine.analysis import analyse
from flowplan.engine.levers import levers
from flowplan.model.edits import with_size
from tests.support.flows import flow_of
from tests.support.random_flows import flows


def judged(flow):
    """Margins of the judged entries on the flow's basis, and what was drawn at most."""
    result = analyse(flow)
    entries = [e for e in result.entries if e.margin is not None]
    largest = max((abs(e.drawn) + abs(e.keep) + e.need.linear for e in entries), default=0.0)
    return [result.margin(e) for e in entries], largest


@settings(max_examples=25)
@given(data=flows())
def test_each_size_changed_in_the_file_does_what_its_lever_says(data):
    flow = flow_of(data)
    found = levers(flow)
    margins, scale = judged(flow)
    if not margins:
        assert found.worst is None
        return
    close = 1e-7 * scale + 1e-9
    assert found.worst == pytest.approx(min(margins), abs=close)
    assert sum(lever.dominates for lever in found.levers) <= len(margins)
    for lever in found.levers[:6]:
        quoted = lever.quoted
        without, _ = judged(with_size(flow, quoted, quoted.quantity(0.0, flow.unit)))
        assert lever.removed.worst == pytest.approx(min(without) - min(margins), abs=close)
        if lever.largest is None:
            half, _ = judged(with_size(flow, quoted, quoted.quantity(lever.value / 2, flow.unit)))
            assert max(min(without), min(half), min(margins)) < close
        elif math.isfinite(lever.largest):
            at_most, _ = judged(with_size(flow, quoted, quoted.quantity(lever.largest, flow.unit)))
            assert min(at_most) == pytest.approx(0, abs=close)


@settings(max_examples=25)
@given(data=flows())
def test_a_size_between_0_and_the_largest_that_passes_at_0_passes(data):
    """Margins are concave in a size, so what passes at both ends passes between them."""
    flow = flow_of(data)
    for lever in levers(flow).levers[:4]:
        if lever.largest is None or math.isinf(lever.largest):
            continue
        sizes = [lever.quoted.quantity(part * lever.largest, flow.unit) for part in (0.0, 0.3, 0.7)]
        at_zero, *between = (judged(with_size(flow, lever.quoted, size)) for size in sizes)
        if min(at_zero[0]) >= 0:
            assert all(min(margins) >= -1e-9 * scale for margins, scale in between)

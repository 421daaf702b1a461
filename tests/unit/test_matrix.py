"""The overlay of every two layers in one array, against an entry for each."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings

from flowplan.engine.analysis import Engine, analyse, every_pair
from flowplan.engine.matrix import outer_sites, overlay_matrix
from flowplan.engine.points import sites_of
from flowplan.model.base import AXES
from tests.support.flows import bare_flow, flow_of, mask
from tests.support.random_flows import flows

TURN = {"turn": {"random": "2 urad", "shape": "rotation", "over": "wafer"}}


def test_three_masks_by_hand():
    """B reads A with 3, C reads A with 4: B on A 3, C on A 4, C on B 5 at one sigma."""
    masks = [mask("A"), mask("B", "A", terms={"t": 3}), mask("C", "A", terms={"t": 4})]
    found = overlay_matrix(Engine.of(flow_of(bare_flow(masks, []))), "x")
    assert found == pytest.approx(np.array([[0, 3, 4], [3, 0, 5], [4, 5, 0]]))


def test_offset_and_bound_add_to_the_random_part():
    masks = [mask("A"), mask("B", "A", terms={"t": {"random": 3, "bound": 10, "offset": -100}})]
    found = overlay_matrix(Engine.of(flow_of(bare_flow(masks, []))), "y")
    assert found[0, 1] == pytest.approx(113)


@settings(max_examples=25)
@given(data=flows())
def test_the_same_as_an_overlay_entry_of_every_two_layers(data):
    flow = flow_of(data)
    result = analyse(flow, pairs=every_pair(flow))
    order = list(flow.layers)
    for axis in AXES:
        found = overlay_matrix(result.engine, axis)
        assert np.array_equal(found, found.T)
        assert not found.diagonal().any()
        for e in result.entries:
            if e.axis == axis:
                size = abs(e.overlay.offset) + e.need.on(flow.basis)
                first, second = (order.index(layer) for layer in e.layers)
                assert found[first, second] == pytest.approx(size, rel=1e-9, abs=1e-6)


def test_more_layers_than_one_block():
    """Forty masks in a row, each 3 from the one before: sqrt(n) times 3 over n steps."""
    names = [f"M{i}" for i in range(40)]
    masks = [mask("M0")]
    masks += [mask(b, a, terms={"t": 3}) for a, b in pairwise(names)]
    found = overlay_matrix(Engine.of(flow_of(bare_flow(masks, []))), "x")
    steps = np.abs(np.subtract.outer(np.arange(40), np.arange(40)))
    assert found == pytest.approx(3 * np.sqrt(steps))


def test_outer_sites_are_corners_of_the_outermost_fields_of_each_row():
    """Three rows of fields on 40 mm: one field above, three across, one below, of 10 mm each."""
    wafer, field = {"diameter": "36 mm"}, {"x": "10 mm", "y": "10 mm"}
    flow = flow_of(bare_flow([mask("A", terms=TURN)], [], wafer=wafer, field=field))
    found = outer_sites(sites_of(flow)).positions
    assert {tuple(p[:2]) for p in found} == {(0, -10), (-10, 0), (10, 0), (0, 10)}
    assert {tuple(np.abs(p[2:])) for p in found} == {(5, 5)}
    assert len(found) == 4 * 4

"""Random flows whose marks are read at sites: against a scalar for every mark, and through what-ifs.

By hand each mark's reading is a scalar of its own, and a fit moves a place by the readings' weights in
the least-squares estimate there. Nothing is factored, so the engine's independent sources are checked
through averages, inheritance, self-aligned features and exposures on the back.
"""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flowplan.engine.analysis import analyse
from flowplan.engine.levers import levers
from flowplan.engine.propose import propose
from flowplan.model.edits import with_size
from tests.marksites.material import SIZES, alignment, design, regressors
from tests.support.byhand import ByHand, Form, deviation, place_of, rows
from tests.support.flows import Data, flow_of, margins_of
from tests.support.random_flows import flows

#: Places in mm that fit the field of 13 mm by 11 mm and the wafer of the random flows.
REACH = {"field": (6, 5), "wafer": (19, 19)}


def well_told(places: list[tuple[float, float]], model: str) -> bool:
    rows = design(model, places)
    return bool(np.linalg.cond(rows / np.maximum(np.linalg.norm(rows, axis=0), 1e-9)) < 100)


@st.composite
def fits(draw: Any) -> Data:
    """An alignment from three to five marks that fix their model well."""
    over, model = draw(st.sampled_from(list(REACH))), draw(st.sampled_from(list(SIZES)))
    along = [st.integers(-most, most).map(float) for most in REACH[over]]
    marks = st.lists(st.tuples(*along), min_size=3, max_size=5, unique=True)
    places = draw(marks.filter(lambda found: well_told(found, model)))
    size = draw(st.sampled_from([12.0, "0.02 um"]))
    kinds = [{"random": size}, {"random": {"x": size, "y": 15}, "uniform": 9}, {"uniform": size}]
    per_mark = draw(st.sampled_from(kinds))
    return alignment(places, model, per_mark, over=over)


@st.composite
def fitted_flows(draw: Any) -> Data:
    """A random flow with the alignment of its tools, and of some readings, from mark sites."""
    data = draw(flows(most_masks=4))
    # Adding everything up depends on how many sources there are, and a fit by hand has one a reading.
    data["basis"] = draw(st.sampled_from(["mixed", "rss"]))
    for tool in data["tools"].values():
        tool["alignment"] = draw(fits())
    for mask in data["masks"]:
        mask["aligns_to"] = _replaced(mask["aligns_to"], draw)
    return data


def _replaced(part: Any, draw: Any) -> Any:
    if isinstance(part, list):
        return [_replaced(entry, draw) for entry in part]
    if isinstance(part, dict) and "mask" in part:
        return part | ({"alignment": draw(fits())} if "alignment" in part and draw(st.booleans()) else {})
    return {axis: _replaced(entry, draw) for axis, entry in part.items()} if isinstance(part, dict) else part


class ByHandWithFits(ByHand):
    """The recursion, with a fit where an alignment names its marks."""

    def fresh(self, size: Any, axis: str, *key: Any) -> Any:
        if not isinstance(size, dict) or "per_mark" not in size:
            return super().fresh(size, axis, *key)
        wafer_x, wafer_y, x, y = self.point
        x, y = (x, y) if size["over"] == "field" else (wafer_x + x, wafer_y + y)
        if self._masks[key[1]].get("side") == "back":
            x = -1.0 * x
        marks = [(self.length(site["x"]) / 1e6, self.length(site["y"]) / 1e6) for site in size["sites"]]
        estimate = np.linalg.pinv(design(size["model"], marks))
        (here,) = regressors(size["model"], [(x, y)])["xy".index(axis)]
        weights = (here @ estimate).reshape(2, -1)
        total = 0.0
        for along, row in zip("xy", weights, strict=True):
            for kind, value in self.parts(size["per_mark"], along):
                for mark, weight in enumerate(row):
                    total = total + weight * value * self.scalar(*key, axis, along, mark, kind)
        return total


@settings(max_examples=40)
@given(data=fitted_flows())
def test_the_random_part_is_that_of_every_mark_read_on_its_own(data):
    for entry, (pair, first, second, axis) in zip(margins_of(data).entries, rows(data), strict=True):
        hand = ByHandWithFits(data, ("random", "uniform"), lambda key: Form({key: 1.0}), place_of(entry))
        residual = hand.overlay(first, second, axis) + hand.edges(pair["rule"], first, second, axis)
        by_hand = Form() if residual == 0.0 else residual
        variance = by_hand.square(lambda key: deviation(data, key))
        expected = data["confidence"] * np.sqrt(variance)
        assert entry.residual.random == pytest.approx(expected, rel=1e-7, abs=1e-6)


def judged(flow):
    """Margins of the judged entries, and the length that rounding is measured against."""
    result = analyse(flow)
    entries = [e for e in result.entries if e.margin is not None]
    scale = max((abs(e.drawn) + abs(e.keep) + e.need.linear for e in entries), default=0.0)
    return [result.margin(e) for e in entries], 1e-7 * scale + 1e-9


@settings(max_examples=20)
@given(data=fitted_flows())
def test_each_size_of_a_mark_does_what_its_lever_says(data):
    flow = flow_of(data)
    margins, close = judged(flow)
    if not margins:
        return
    for lever in [one for one in levers(flow).levers if "per_mark" in one.quoted.path][:4]:
        quoted = lever.quoted
        without, _ = judged(with_size(flow, quoted, quoted.quantity(0.0, flow.unit)))
        assert lever.removed.worst == pytest.approx(min(without) - min(margins), abs=close)


@settings(max_examples=15)
@given(data=fitted_flows())
def test_the_best_plan_found_has_the_margin_that_it_is_said_to_have(data):
    flow = flow_of(data)
    if len(flow.masks) < 3 or not judged(flow)[0]:
        return
    found = propose(flow, goal="worst", free_all=True)
    before, close = judged(flow)
    after, _ = judged(found.flow)
    assert min(after) >= min(before) - close
    assert found.proved

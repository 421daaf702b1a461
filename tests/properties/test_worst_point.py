"""The reported point and margin against trying every site, on both sides, one pair at a time."""

import numpy as np
import pytest
from hypothesis import given

from flowplan.engine.residual import residuals, rows_of
from flowplan.model.base import AXES
from tests.support.byhand import ByHand, Form, deviation, rows, sites
from tests.support.flows import margins_of
from tests.support.random_flows import flows

BASES = ("mixed", "rss", "linear")


def length(data, pair, key, axis):
    value = pair.get(key, 0)
    return ByHand(data, (), None).length(value[axis] if isinstance(value, dict) else value)


def margins_everywhere(data, row, places):
    """Return the margin by each basis, shape (sides, points); without a limit, minus the error."""
    pair, first, second, axis = row
    point = tuple(places.T)

    def parts(kinds, scalar):
        hand = ByHand(data, kinds, scalar, point)
        return hand.overlay(first, second, axis), hand.edges(pair["rule"], first, second, axis)

    offset, edge_offset = parts(("offset",), lambda key: 1.0)
    drawn = length(data, pair, "limit" if pair["rule"] == "overlay" else "drawn", axis)
    keep = length(data, pair, "keep", axis)
    room = np.stack([drawn + side * offset + edge_offset - keep + 0 * places[:, 0] for side in (1, -1)])
    bound = sum(parts(("bound",), lambda key: Form({key: 1.0})), Form()).absolute()
    spread = sum(parts(("random", "uniform"), lambda key: Form({key: 1.0})), Form())
    random = data["confidence"] * np.sqrt(spread.square(lambda key: deviation(data, key)))
    linear = bound + data["confidence"] * spread.absolute(lambda key: deviation(data, key))
    need = {"mixed": bound + random, "rss": np.hypot(bound, random), "linear": linear}
    return {basis: room - need[basis] for basis in BASES}


@given(data=flows())
def test_no_site_and_no_side_is_worse(data):
    places = sites(data)
    for entry, row in zip(margins_of(data).entries, rows(data), strict=True):
        everywhere = margins_everywhere(data, row, places)
        worst = everywhere[data["basis"]].min(axis=0)
        near = {"rel": 1e-9, "abs": 1e-9 * (1 + abs(worst).max())}
        reported = -entry.need.on(data["basis"]) + entry.residual.offset
        if entry.margin is not None:
            reported = entry.margin.on(data["basis"])
        assert reported == pytest.approx(worst.min(), **near)
        if entry.point is None:
            assert worst == pytest.approx(worst[0], **near)
            continue
        p = entry.point
        (here,) = np.flatnonzero(np.all(np.isclose(places, (p.X, p.Y, p.x, p.y), atol=1e-9), axis=1))
        assert worst[here] == pytest.approx(worst.min(), **near)
        if entry.margin is not None:
            for basis in BASES:
                assert entry.margin.on(basis) == pytest.approx(everywhere[basis][:, here].min(), **near)


@given(data=flows())
def test_the_map_is_the_margin_at_every_site(data):
    result = margins_of(data)
    places = sites(data)
    order = result.engine.sites.positions if len(result.engine.sites.positions) > 1 else places
    by_place = {tuple(np.round(p, 6) + 0.0): i for i, p in enumerate(places)}
    where = [by_place[tuple(np.round(p, 6) + 0.0)] for p in order]
    assert sorted(where) == list(range(len(places)))
    for axis in AXES:
        chosen = [(e, row) for e, row in zip(result.entries, rows(data), strict=True) if e.axis == axis]
        maps = result.engine.margin_map([e for e, _ in chosen])
        for (_, row), found in zip(chosen, maps, strict=True):
            by_hand = margins_everywhere(data, row, places)[data["basis"]].min(axis=0)[where]
            scale = 1e-9 * (1 + abs(by_hand).max())
            np.testing.assert_allclose(np.broadcast_to(found, by_hand.shape), by_hand, rtol=1e-9, atol=scale)


@given(data=flows())
def test_edges_and_placement_share_no_source(data):
    """Only then are the random parts of both sides the same, as the residual takes for granted."""
    result = margins_of(data)
    for axis in AXES:
        chosen = tuple(row for row in rows_of(result.flow, result.flow.pairs) if row.axis == axis)
        found = residuals(result.flow, result.engine.placement, chosen, axis)
        assert not np.any((found.overlay != 0).any(axis=0) & (found.edges != 0).any(axis=0))

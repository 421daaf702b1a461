"""The five rules against drawn rectangles: shift and grow both layers, then measure what is left.

Only known offsets are in play, so every layer is an interval on the axis whose edges are where the
definition of the rule says; the smaller of the two sides counts.
"""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.support.byhand import ByHand, place_of, rows
from tests.support.flows import bare_flow, margins_of, mask
from tests.support.random_flows import flows, signed

WIDE = 5000.0  # half of a feature's drawn width [nm], larger than any error


def interval(centre, half_width, place, grown):
    return centre + place - half_width - grown, centre + place + half_width + grown


def border(drawn, outer, inner):
    """`outer` around `inner`, both drawn about 0: how far it reaches past it on the worse side."""
    low, high = interval(0, WIDE + drawn, *outer)
    inner_low, inner_high = interval(0, WIDE, *inner)
    return min(high - inner_high, inner_low - low)


def gap(drawn, one, other):
    """`other` stands to the right of `one`, and somewhere else to its left."""
    right = interval(2 * WIDE + drawn, WIDE, *other)[0] - interval(0, WIDE, *one)[1]
    left = interval(0, WIDE, *one)[0] - interval(-2 * WIDE - drawn, WIDE, *other)[1]
    return min(right, left)


def lap(drawn, one, other):
    """`other` reaches over the right edge of `one`, and somewhere else over its left edge."""
    right = interval(0, WIDE, *one)[1] - interval(2 * WIDE - drawn, WIDE, *other)[0]
    left = interval(-2 * WIDE + drawn, WIDE, *other)[1] - interval(0, WIDE, *one)[0]
    return min(right, left)


MEASURE = {
    "enclosure": border,
    "extension": border,
    "spacing": gap,
    "overlap": lap,
    "overlay": lambda limit, one, other: limit - abs(other[0] - one[0]),
}


def pair_of(rule, drawn):
    named = {"enclosure": {"outer": "A", "inner": "B"}, "extension": {"of": "A", "past": "B"}}
    size = "limit" if rule == "overlay" else "drawn"
    return {"name": "p", "rule": rule, size: drawn} | named.get(rule, {"between": ["A", "B"]})


@pytest.mark.parametrize("rule", MEASURE)
@given(numbers=st.tuples(*[signed] * 4))
def test_two_masks(rule, numbers):
    place_a, place_b, grown_a, grown_b = numbers
    masks = [
        mask("A", terms={"t": {"offset": place_a}}, edge={"offset": grown_a}),
        mask("B", terms={"t": {"offset": place_b}}, cd={"offset": 2 * grown_b}),
    ]
    expected = MEASURE[rule](300, (place_a, grown_a), (place_b, grown_b))
    for entry in margins_of(bare_flow(masks, [pair_of(rule, 300)])).entries:
        assert entry.margin.mixed == pytest.approx(expected, abs=1e-9)


@given(data=flows())
def test_any_flow_with_nothing_but_its_offsets(data):
    """The nominal of a random flow is the drawn rectangle at the worst point, errors left away."""
    for entry, (pair, first, second, axis) in zip(margins_of(data).entries, rows(data), strict=True):
        if entry.nominal is None:
            continue
        hand = ByHand(data, ("offset",), lambda key: 1.0, place_of(entry))
        one, other = ((hand.device(layer, axis), hand.edge(layer, axis)) for layer in (first, second))
        assert entry.nominal == pytest.approx(MEASURE[pair["rule"]](entry.drawn, one, other), abs=1e-6)

"""Cpk and fail probability against scipy.stats, tails included, and what the verdict is made from."""

import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy.stats import norm

from flowplan.engine.margin import capability, tail, verdict_of
from tests.support.flows import bare_flow, margins_of, mask, overlay_pair
from tests.support.random_flows import flows

BASES = ("mixed", "rss", "linear")


def sides(entry):
    """What is left on each side before the random part [nm]; the overlay's offset tells them apart."""
    edge_offset = entry.residual.offset + abs(entry.overlay.offset)
    room = entry.drawn + edge_offset - entry.keep - entry.residual.bound
    return room + entry.overlay.offset, room - entry.overlay.offset


@given(data=flows())
def test_random_flows_against_the_normal_distribution(data):
    for entry in margins_of(data).entries:
        if entry.margin is None:
            assert (entry.cpk, entry.fail_probability, entry.nominal) == (None, None, None)
            continue
        sigma = entry.residual.random / data["confidence"]
        rooms = sides(entry)
        if sigma == 0:
            assert math.isinf(entry.cpk)
            assert entry.fail_probability in (0.0, 1.0)
            continue
        assert entry.cpk == pytest.approx(min(rooms) / (3 * sigma), rel=1e-9, abs=1e-9)
        expected = min(1.0, sum(norm.sf(room, scale=sigma) for room in rooms))
        assert entry.fail_probability == pytest.approx(expected, rel=1e-7, abs=1e-300)


@given(room=st.floats(-38, 38), sigma=st.floats(1e-3, 1e6))
def test_tail(room, sigma):
    assert tail(room * sigma, sigma) == pytest.approx(
        norm.sf(room * sigma, scale=sigma), rel=1e-11, abs=1e-307
    )


@given(sigma=st.floats(0.01, 100), offset=st.floats(-50, 50), limit=st.floats(0.1, 200))
def test_one_term_against_a_limit(sigma, offset, limit):
    terms = {"t": {"random": sigma, "offset": offset}}
    data = bare_flow([mask("A"), mask("B", "A", terms=terms)], [overlay_pair("A", "B", limit=limit)])
    (found, _) = margins_of(data).entries
    outside = norm.cdf(-limit, offset, sigma) + norm.sf(limit, offset, sigma)
    assert found.cpk == pytest.approx((limit - abs(offset)) / (3 * sigma), rel=1e-9, abs=1e-12)
    assert found.fail_probability == pytest.approx(outside, rel=1e-7, abs=1e-300)


@given(data=flows())
def test_verdict_cpk_and_probability_go_together(data):
    """At Cpk k / 3 the mixed margin at confidence k is 0; a worse Cpk means a higher probability."""
    for entry in margins_of(data).entries:
        if entry.margin is None:
            assert entry.verdict == "unjudged"
            continue
        sigma = entry.residual.random / data["confidence"]
        if sigma and abs(entry.margin.mixed) > 1e-6:
            assert (entry.margin.mixed < 0) == (entry.cpk < data["confidence"] / 3)
        one_side = norm.sf(3 * entry.cpk) if sigma else float(min(sides(entry)) < 0)
        assert one_side * (1 - 1e-7) <= entry.fail_probability <= 2 * one_side * (1 + 1e-7)


@given(data=flows())
def test_rss_never_takes_more_than_mixed_and_mixed_never_more_than_linear(data):
    for entry in margins_of(data).entries:
        slack = 1e-9 * (1 + entry.need.linear)
        assert entry.need.rss <= entry.need.mixed + slack
        assert entry.need.mixed <= entry.need.linear + slack
        if entry.margin is not None:
            for basis in BASES:
                left = entry.nominal - entry.keep - entry.need.on(basis)
                assert entry.margin.on(basis) == pytest.approx(left, abs=1e-9 * (1 + abs(entry.nominal)))


@given(margin=st.floats(-100, 100), drawn=st.floats(0, 1000), reserve=st.floats(0, 1))
def test_verdict(margin, drawn, reserve):
    expected = "fail" if margin < 0 else "tight" if margin < reserve * drawn else "pass"
    assert verdict_of(margin, drawn, reserve) == expected


@given(room=st.floats(-1e6, 1e6))
def test_without_variation_the_answer_is_certain(room):
    assume(room != 0)
    assert capability(room, 0) == math.copysign(math.inf, room)
    assert tail(room, 0) == (1.0 if room < 0 else 0.0)

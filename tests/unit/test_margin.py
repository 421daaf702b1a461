"""From parts to a margin: the three needs, the verdict, capability, and what counts as nothing."""

import math

import numpy as np
import pytest

from flowplan.engine.margin import capability, needs, settle, tail, verdict_of
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair

GEOMETRY = {"wafer": {"diameter": "60 mm"}, "field": {"x": "10 mm", "y": "10 mm"}}


def judged(limit=30, terms=None, **more):
    masks = [mask("A"), mask("B", "A", terms={"t": {"random": 4, "bound": 3}} if terms is None else terms)]
    return entry(margins_of(bare_flow(masks, [overlay_pair("A", "B", limit=limit)], **more)), "A-B")


def test_needs():
    found = needs(np.array([3.0]), np.array([4.0]), np.array([6.0]))
    assert {k: v[0] for k, v in found.items()} == {"mixed": 7, "rss": 5, "linear": 9}


def test_the_margin_on_every_basis():
    found = judged()
    assert (found.margin.mixed, found.margin.rss, found.margin.linear) == pytest.approx((23, 25, 23))


@pytest.mark.parametrize(("basis", "verdict"), [("mixed", "fail"), ("rss", "pass"), ("linear", "fail")])
def test_the_verdict_goes_by_the_flow_s_basis(basis, verdict):
    assert judged(limit=6, basis=basis).verdict == verdict


@pytest.mark.parametrize(
    ("margin", "reserve", "verdict"),
    [
        (-0.001, 0.0, "fail"),
        (0.0, 0.0, "pass"),
        (0.0, 0.1, "tight"),
        (9.99, 0.1, "tight"),
        (10.0, 0.1, "pass"),
    ],
)
def test_verdict_at_its_borders(margin, reserve, verdict):
    assert verdict_of(margin, drawn=100, reserve=reserve) == verdict


def test_a_margin_that_is_only_rounding_is_zero():
    """0.1 + 0.2 is not 0.3 in binary; the drawn 0.3 that it takes up is taken up exactly."""
    found = judged(limit=0.3, terms={"a": {"bound": 0.1}, "b": {"bound": 0.2}})
    assert found.margin.mixed == 0.0
    assert (found.verdict, found.cpk, found.fail_probability) == ("pass", math.inf, 0.0)


def test_settle_keeps_what_is_more_than_rounding():
    assert settle(1e-13, 0.5, 0.5) == 0.0
    assert settle(1e-11, 0.5, 0.5) == 1e-11
    assert settle(-3.0, 5.0, 8.0) == -3.0


@pytest.mark.parametrize(("room", "cpk"), [(1.0, math.inf), (-1.0, -math.inf), (0.0, math.inf)])
def test_capability_without_variation(room, cpk):
    assert capability(room, 0) == cpk


@pytest.mark.parametrize(("room", "probability"), [(1.0, 0.0), (0.0, 0.0), (-1.0, 1.0)])
def test_tail_without_variation(room, probability):
    assert tail(room, 0) == probability


def test_a_hopeless_pair_fails_for_certain_not_more():
    """Both sides lie outside: the probabilities 1 and 1 add up to at most 1."""
    found = judged(limit=0, terms={"t": {"random": 0.001, "bound": 50}})
    assert found.fail_probability == 1.0


def test_no_limit_means_no_judgement():
    found = judged(limit=None)
    assert (found.drawn, found.nominal, found.margin, found.cpk, found.fail_probability) == (None,) * 5
    assert (found.verdict, found.need.mixed) == ("unjudged", 7)


@pytest.mark.parametrize("basis", ["mixed", "rss", "linear"])
def test_the_worst_point_goes_by_the_basis(basis):
    """On y, 1 urad of bound grows with |x| and 3 random ppm with |y|; fields of 30 x 10 mm.

    mixed and linear see 15 + 3 * 5 at the corner, and so does rss; only the sizes differ.
    """
    terms = {
        "turn": {"bound": "1 urad", "shape": "rotation"},
        "growth": {"random": "3 ppm", "shape": "magnification"},
        "more": {"random": "4 ppm", "shape": "scale"},
    }
    masks = [mask("A"), mask("B", "A", terms=terms)]
    data = bare_flow(
        masks, [overlay_pair("A", "B", limit=99)], basis=basis, field={"x": "30 mm", "y": "10 mm"}
    )
    found = entry(margins_of(data), "A-B", "y")
    assert (abs(found.point.x), abs(found.point.y)) == (15, 5)
    assert found.need.mixed == pytest.approx(15 + 5 * 5)
    assert found.need.rss == pytest.approx(math.hypot(15, 5 * 5))
    assert found.need.linear == pytest.approx(15 + 3 * 5 + 4 * 5)


def test_of_equally_bad_corners_the_first_is_reported():
    terms = {"turn": {"random": "1 urad", "shape": "rotation", "over": "wafer"}}
    masks = [mask("A"), mask("B", "A", terms=terms)]
    result = margins_of(bare_flow(masks, [overlay_pair("A", "B", limit=99)], **GEOMETRY))
    assert entry(result, "A-B", "x").point.Y < 0
    assert entry(result, "A-B", "y").point.X < 0

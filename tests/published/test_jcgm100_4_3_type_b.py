"""JCGM 100:2008 (GUM), 4.3.7 and 4.3.9 and H.1: standard uncertainty of an error within +-a.

Clause numbers are from memory; the rectangular and arcsine uses were read in H.1. The flow file
knows the rectangular shape (`uniform`). A symmetric trapezoid is the sum of two rectangles, a
triangle that of two equal ones, so both can be written as two terms. The arcsine shape cannot be
built from rectangles: a flow quotes it as `random` with the a/sqrt(2) worked out by hand.
"""

import math

import pytest

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure


def spread(terms, **more):
    masks = [mask("REF"), mask("NEXT", "REF", terms=terms)]
    result = margins_of(bare_flow(masks, [overlay_pair("REF", "NEXT")], **more))
    return entry(result, "REF-NEXT").overlay.random


def test_rectangular():
    assert Figure("0.577350", 1 / math.sqrt(3), "a/sqrt(3)").agrees_with(spread({"t": {"uniform": 1}}))


def test_rectangular_does_not_depend_on_the_sigma_of_the_file():
    assert spread({"t": {"uniform": 1}}, sigma=3) == spread({"t": {"uniform": 1}}, sigma=1)


def test_triangular_is_two_equal_rectangles():
    halves = {"one": {"uniform": 0.5}, "other": {"uniform": 0.5}}
    assert Figure("0.408248", 1 / math.sqrt(6), "a/sqrt(6)").agrees_with(spread(halves))


@pytest.mark.parametrize(("top", "printed"), [(0.5, "0.456435"), (0.0, "0.408248"), (1.0, "0.577350")])
def test_trapezoid_is_two_rectangles(top, printed):
    """Half-widths a(1 + top)/2 and a(1 - top)/2 add to base a and flat part `top` times a."""
    parts = {"wide": {"uniform": (1 + top) / 2}, "narrow": {"uniform": (1 - top) / 2}}
    figure = Figure(printed, math.sqrt((1 + top**2) / 6), "a sqrt((1 + top^2)/6)")
    assert figure.agrees_with(spread(parts))


def test_arcsine_is_quoted_as_random():
    """H.1: a cyclic temperature within +-0.5 K is printed as 0.35 K."""
    figure = Figure("0.35", 0.5 / math.sqrt(2), "a/sqrt(2), entered by hand")
    assert figure.agrees_with(spread({"cycle": {"random": 0.5 / math.sqrt(2)}}))

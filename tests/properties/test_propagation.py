"""Every pair's error against two packages for uncertain numbers, `uncertainties` and GTC.

Both run the recursion of `tests.support.byhand`, which knows nothing of modes, arrays or graphs, at
the point that the entry reports. GTC tells elementary numbers apart by identity, `uncertainties` by
variable; both therefore cancel what two layers share by their own means.
"""

import math

import GTC
import pytest
from hypothesis import given
from uncertainties import ufloat

from tests.support.byhand import ByHand, Form, deviation, place_of, rows, scale_of
from tests.support.flows import margins_of
from tests.support.random_flows import flows

SPREAD = ("random", "uniform")


def std_by_uncertainties(value):
    return getattr(value, "std_dev", 0.0)


def std_by_gtc(value):
    return GTC.uncertainty(value)


def close(value, scale):
    """To 1e-9 of the value; what cancels leaves rounding of the size of what was added up."""
    return pytest.approx(value, rel=1e-9, abs=1e-13 * scale)


@pytest.mark.parametrize(
    ("scalar", "std"),
    [
        pytest.param(lambda std: ufloat(0, std), std_by_uncertainties, id="uncertainties"),
        pytest.param(lambda std: GTC.ureal(0, std), std_by_gtc, id="GTC"),
    ],
)
@given(data=flows())
def test_variance(scalar, std, data):
    confidence = data["confidence"]
    for entry, row in zip(margins_of(data).entries, rows(data), strict=True):
        overlay, edges = parts(data, entry, row, SPREAD, lambda key: scalar(deviation(data, key)))
        whole = overlay + edges
        scale = scale_of(data, entry)
        assert entry.overlay.random == close(confidence * std(overlay), scale)
        assert entry.residual.random == close(confidence * std(whole), scale)


@given(data=flows())
def test_bounds_offsets_and_the_sum_of_every_deviation(data):
    confidence = data["confidence"]
    for entry, row in zip(margins_of(data).entries, rows(data), strict=True):
        scale = scale_of(data, entry)

        overlay, edges = parts(data, entry, row, ("offset",), lambda key: 1.0)
        assert entry.overlay.offset == close(overlay, scale)
        assert entry.residual.offset == close(edges - abs(overlay), scale)

        overlay, edges = parts(data, entry, row, ("bound",), lambda key: Form({key: 1.0}))
        bound = (Form() + overlay + edges).absolute()
        assert entry.overlay.bound == close((Form() + overlay).absolute(), scale)
        assert entry.residual.bound == close(bound, scale)

        overlay, edges = parts(data, entry, row, SPREAD, lambda key: Form({key: 1.0}))
        whole = Form() + overlay + edges
        random = confidence * math.sqrt(whole.square(lambda key: deviation(data, key)))
        linear = confidence * whole.absolute(lambda key: deviation(data, key))
        assert entry.need.linear == close(bound + linear, scale)
        assert entry.need.mixed == close(bound + random, scale)
        assert entry.need.rss == close(math.hypot(bound, random), scale)


def parts(data, entry, row, kinds, scalar):
    """Overlay and edges of a row, of some kinds alone, at the entry's point."""
    pair, first, second, axis = row
    hand = ByHand(data, kinds, scalar, place_of(entry))
    return hand.overlay(first, second, axis), hand.edges(pair["rule"], first, second, axis)

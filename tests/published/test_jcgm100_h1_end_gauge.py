"""JCGM 100:2008 (GUM), annex H.1: calibration of a 50 mm end gauge, as an error budget of one mask.

Each contribution to the length (H.1, table H.1) is a term of the mask GAUGE, in nm. The expansion
coefficient of the standard and the mean temperature have sensitivity 0 at first order, so they
have no term. Limits: degrees of freedom and the second-order terms of H.1.7 (34 nm) have no place
in a flow.
"""

import math

import pytest
from GTC import ureal

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure

LENGTH = 50_000_623.0  # nm, the standard
EXPANSION = 11.5e-6  # 1/K, of the standard
ROOT3 = math.sqrt(3)
MEAN_TEMPERATURE = 0.1  # K away from 20 degC, sign of no account

READ_FROM_TABLE = {"standard": 25.0, "readings": 5.8, "comparator random": 3.9, "comparator systematic": 6.7}


def combined(terms):
    masks = [mask("REF"), mask("GAUGE", "REF", terms=terms)]
    result = margins_of(bare_flow(masks, [overlay_pair("REF", "GAUGE")]))
    return entry(result, "REF-GAUGE").overlay.random


def by_gtc():
    """Propagate H.1's own model l = ls + d - ls (d_alpha theta + alpha_s d_theta) at first order."""
    standard = ureal(LENGTH, 25)
    difference = ureal(215, 5.8) + ureal(0, 3.9) + ureal(0, 6.7)
    expansion, expansion_difference = ureal(EXPANSION, 2e-6 / ROOT3), ureal(0, 1e-6 / ROOT3)
    temperature, temperature_difference = ureal(-MEAN_TEMPERATURE, 0.41), ureal(0, 0.05 / ROOT3)
    shrinkage = expansion_difference * temperature + expansion * temperature_difference
    return (standard + difference - standard * shrinkage).u


def test_unrounded_inputs():
    figure = Figure("32", by_gtc(), "31.664; the sum of squares without rounding, the model run by GTC")
    value = combined(
        READ_FROM_TABLE
        | {
            "difference in expansion": {"uniform": LENGTH * MEAN_TEMPERATURE * 1e-6},
            "difference in temperature": {"uniform": LENGTH * EXPANSION * 0.05},
        }
    )
    assert figure.agrees_with(value)


def test_inputs_rounded_as_printed():
    figure = Figure("31.71", 31.705, "u = 0.58e-6 /K and 0.029 K as printed, d as one 9.7 nm")
    value = combined(
        {
            "standard": 25.0,
            "difference": 9.7,
            "difference in expansion": LENGTH * MEAN_TEMPERATURE * 0.58e-6,
            "difference in temperature": LENGTH * EXPANSION * 0.029,
        }
    )
    assert value == pytest.approx(float(figure.printed), abs=figure.tolerance)


@pytest.mark.parametrize(
    ("term", "figure"),
    [
        ({"uniform": LENGTH * MEAN_TEMPERATURE * 1e-6}, Figure("2.9", 2.886787, "rectangular, a/sqrt(3)")),
        ({"uniform": LENGTH * EXPANSION * 0.05}, Figure("16.6", 16.599028, "rectangular, a/sqrt(3)")),
    ],
)
def test_temperature_contributions(term, figure):
    assert figure.agrees_with(combined({"term": term}))


def test_difference_of_readings():
    figure = Figure("9.7", math.sqrt(5.8**2 + 3.9**2 + 6.7**2), "three printed parts, rounded sum 9.68")
    parts = {k: v for k, v in READ_FROM_TABLE.items() if k != "standard"}
    assert figure.agrees_with(combined(parts))

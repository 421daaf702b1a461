"""NIST/SEMATECH e-Handbook of Statistical Methods, 6.1.6: capability against rejects.

The definitions of Cp and Cpk were read there; the table's figures are from memory and checked with
scipy. An overlay with the limit k sigma has Cp = k/3 and its rejects on both sides.
"""

import pytest
from scipy.stats import norm

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure


def judged(limit, sigma=1.0, mean=0.0, **more):
    terms = {"spread": {"random": sigma, "offset": mean}}
    masks = [mask("REF"), mask("NEXT", "REF", terms=terms)]
    data = bare_flow(masks, [overlay_pair("REF", "NEXT", limit=limit)])
    return entry(margins_of(data | more), "REF-NEXT")


#: limit in sigma -> (Cp, rejects, factor by which the printed rejects are multiplied to ppm).
TABLE = {
    3: (1.00, Figure("0.27", 0.269979606, "per cent"), 1e4),
    4: (4 / 3, Figure("32", 31.671242, "64 ppm printed: one side, 31.67, rounded and then doubled"), 2),
    5: (5 / 3, Figure("0.6", 0.5733031, "ppm, rounded to one digit"), 1),
    6: (2.00, Figure("2", 1.973175, "parts in 1e9, rounded to one digit"), 1e-3),
}


@pytest.mark.parametrize("limit", TABLE)
def test_rejects_on_both_sides(limit):
    cp, rejects, factor = TABLE[limit]
    found = judged(limit)
    assert found.cpk == pytest.approx(cp, rel=1e-12)
    assert rejects.agrees_with(found.fail_probability * 1e6 / factor)
    assert found.fail_probability == pytest.approx(2 * norm.sf(limit), rel=1e-12)


def test_six_sigma_with_a_shift_of_one_and_a_half():
    figure = Figure("3.4", 3.397673, "ppm; the far side adds 3e-8 ppm")
    assert figure.agrees_with(judged(6, mean=1.5).fail_probability * 1e6)


@pytest.mark.parametrize(
    ("mean", "sigma", "limit", "probability", "cpk"),
    [
        (10, 10, 40, Figure("1.350185e-3", norm.sf(3) + norm.sf(5), "scipy"), Figure("1.0", 1.0, "30/30")),
        (5, 8, 30, Figure("8.950969e-4", norm.sf(25 / 8) + norm.sf(35 / 8), "scipy"),
         Figure("1.041667", 25 / 24, "25/24")),
    ],
)  # fmt: skip
def test_a_mean_off_centre(mean, sigma, limit, probability, cpk):
    found = judged(limit, sigma, mean)
    assert probability.agrees_with(found.fail_probability)
    assert cpk.agrees_with(found.cpk)


def test_mean_plus_three_sigma_is_what_the_need_and_the_offset_take():
    """Overlay figure of merit, common practice, no source: |mean| + 3 sigma against a limit."""
    found = judged(30, 8, 5, confidence=3)
    assert found.margin.mixed == pytest.approx(30 - 29, abs=1e-12)

"""JCGM 101:2008, clause 9.2: the sum of four independent inputs (clause read, figures from memory).

The standard uncertainty is exact here. The 95 % half-widths printed for the GUM framework are those
of a normal distribution and are what flowplan gives. For rectangular inputs the true half-widths
are smaller (3.88 and 17.0 by the clause's Monte Carlo): flowplan takes every sum as normal and is
then on the safe side, which is a limit of the tool and stated as such.
"""

import math

import pytest

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure

ROOT3 = math.sqrt(3)
COVERAGE_95 = 1.959964  # of a normal distribution, 97.5 % quantile

CASES = {
    "9.2.2 four normal": (
        [{"random": 1.0}] * 4,
        Figure("2.0", 2.0, "sqrt(4)"),
        Figure("3.92", 3.919928, "normal in truth as well"),
    ),
    "9.2.3 four rectangular": (
        [{"uniform": ROOT3}] * 4,
        Figure("2.0", 2.0, "sqrt(4)"),
        Figure("3.92", 3.919928, "framework figure; the exact one is 3.879"),
    ),
    "9.2.4 one of them ten times as large": (
        [{"uniform": ROOT3}] * 3 + [{"uniform": 10 * ROOT3}],
        Figure("10.1", math.sqrt(103), "sqrt(103)"),
        Figure("19.9", COVERAGE_95 * math.sqrt(103), "framework figure; the exact one is 17.02"),
    ),
}


def summed(terms, confidence):
    masks = [mask("REF"), mask("Y", "REF", terms={f"X{i}": t for i, t in enumerate(terms, 1)})]
    data = bare_flow(masks, [overlay_pair("REF", "Y")])
    return entry(margins_of(data | {"confidence": confidence}), "REF-Y").overlay.random


@pytest.mark.parametrize("case", CASES)
def test_standard_uncertainty(case):
    terms, standard, _ = CASES[case]
    assert standard.agrees_with(summed(terms, 1))


@pytest.mark.parametrize("case", CASES)
def test_half_width_of_the_framework(case):
    terms, _, half_width = CASES[case]
    assert half_width.agrees_with(summed(terms, COVERAGE_95))


def test_true_half_width_of_four_rectangles_is_smaller():
    """Irwin-Hall in closed form: 2 sqrt(3) (2 - (3/5)^(1/4)) = 3.88 as the clause prints."""
    exact = 2 * ROOT3 * (2 - 0.6**0.25)
    assert Figure("3.88", 3.879407, "closed form").agrees_with(exact)
    assert exact < summed([{"uniform": ROOT3}] * 4, COVERAGE_95)

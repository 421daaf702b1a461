"""scipy.stats.norm: tails of the normal distribution far beyond any table."""

import numpy as np
import pytest
from scipy.stats import norm

from flowplan.engine.margin import tail
from tests.support.published import Figure

#: Fraction outside +-k sigma, both sides.
OUTSIDE = {
    1: "0.3173105",
    2: "0.04550026",
    3: "2.699796e-3",
    4: "6.334248e-5",
    4.5: "6.795346e-6",
    5: "5.733031e-7",
    6: "1.973175e-9",
}


@pytest.mark.parametrize("k", OUTSIDE)
def test_outside_k_sigma(k):
    assert Figure(OUTSIDE[k], 2 * norm.sf(k), "scipy").agrees_with(2 * tail(k, 1))


@pytest.mark.parametrize("sigma", [0.013, 1.0, 47.0])
def test_every_tail_down_to_the_smallest_normal_number(sigma):
    """Beyond 37.5 sigma doubles run out of digits (below 2.3e-308), for scipy as well."""
    k = np.linspace(-37, 37, 1481)
    ours = [tail(room * sigma, sigma) for room in k]
    np.testing.assert_allclose(ours, norm.sf(k), rtol=1e-12)

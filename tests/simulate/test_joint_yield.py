"""Joint yield of correlated pairs against orthant and box probabilities of a multivariate normal."""

import math

import numpy as np
import pytest
from scipy.stats import multivariate_normal

from tests.simulate.flows import holds, simulated
from tests.support.flows import bare_flow, mask, overlay_pair

SAMPLES = 100_000


def test_quadrant_of_two_pairs():
    """An offset as large as the limit leaves one side: both hold in 1/4 + asin(r) / (2 pi)."""
    masks = [
        mask("A"),
        mask("B", "A", terms={"t": {"random": 1.0, "offset": 500.0}}),
        mask("C", "B", terms={"t": 1.0}),
    ]
    pairs = [overlay_pair("A", "B", limit=500.0, axes="x"), overlay_pair("A", "C", limit=500.0, axes="x")]
    found = simulated(bare_flow(masks, pairs), SAMPLES)
    exact = 0.25 + math.asin(math.sqrt(0.5)) / (2 * math.pi)
    assert multivariate_normal(cov=[[1, 1], [1, 2]]).cdf([0, 0]) == pytest.approx(exact, abs=1e-6)
    assert holds(exact, found.joint_yield, SAMPLES)
    assert found.product_yield == pytest.approx(0.25, abs=0.01)
    assert found.joint_yield_interval[0] > found.product_yield


def test_box_of_a_chain_of_four():
    """Overlays against the first mask of a chain grow by one reading a step, all with common history."""
    masks = [mask("A"), *(mask(b, a, terms={"t": 1.0}) for a, b in zip("ABC", "BCD", strict=True))]
    limits = [1.0, 1.5, 2.0]
    pairs = [overlay_pair("A", b, limit=v, axes="x") for b, v in zip("BCD", limits, strict=True)]
    found = simulated(bare_flow(masks, pairs), SAMPLES)
    cov = np.minimum.outer([1, 2, 3], [1, 2, 3])
    exact = multivariate_normal(cov=cov).cdf(limits, lower_limit=-np.array(limits))
    assert holds(float(exact), found.joint_yield, SAMPLES)
    assert found.rare.fail == pytest.approx(1 - exact, rel=4 * found.rare.relative_error + 1e-4)


def test_independent_axes_multiply():
    masks = [mask("A"), mask("B", "A", terms={"t": 1.0})]
    found = simulated(bare_flow(masks, [overlay_pair("A", "B", limit=1.2)]), SAMPLES)
    assert holds(found.product_yield, found.joint_yield, SAMPLES)


def test_a_rotation_couples_the_axes():
    """One scalar turns both axes: at a corner of a square field they fail together."""
    masks = [mask("A"), mask("B", "A", terms={"r": {"random": "1 urad", "shape": "rotation"}})]
    field = {"x": "20 mm", "y": "20 mm"}
    found = simulated(bare_flow(masks, [overlay_pair("A", "B", limit=10.0)], field=field), SAMPLES)
    assert [p.fails for p in found.pairs] == [found.pairs[0].fails] * 2
    assert found.joint_yield == 1 - found.pairs[0].fail

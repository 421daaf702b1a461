"""The sources of an entry put together again are the entry."""

import math

import numpy as np
import pytest
from hypothesis import given

from flowplan.engine.explain import explain
from tests.support.byhand import scale_of
from tests.support.flows import margins_of
from tests.support.random_flows import flows

#: Standard deviation of an error of size 1, as the flow file quotes it.
DEVIATION = {"random": lambda sigma: 1 / sigma, "uniform": lambda sigma: 1 / math.sqrt(3)}


def close(value):
    return pytest.approx(value, rel=1e-9, abs=1e-9)


@given(data=flows())
def test_contributions_add_up(data):
    for entry in margins_of(data).entries:
        parts = {kind: [] for kind in ("random", "uniform", "bound", "offset")}
        for row in entry.sources:
            parts[row.source.kind].append(row.contribution)
            assert row.contribution == close(row.coefficient * row.source.size)
            assert row.contribution != 0
        assert sum(parts["offset"]) == close(entry.residual.offset)
        assert sum(map(abs, parts["bound"])) == close(entry.residual.bound)
        varying = [c * DEVIATION[k](data["sigma"]) for k in DEVIATION for c in parts[k]]
        assert data["confidence"] * math.hypot(*varying) == close(entry.residual.random)
        linear = data["confidence"] * sum(map(abs, varying))
        assert entry.residual.bound + linear == close(entry.need.linear)


@given(data=flows())
def test_shares_add_up_to_one_and_are_shares_of_the_variance(data):
    for entry in margins_of(data).entries:
        shares = [row.share for row in entry.sources]
        assert shares == sorted(shares, reverse=True)
        if entry.residual.random == 0:
            assert not any(shares)
            continue
        assert sum(shares) == pytest.approx(1, rel=1e-12)
        sigma = entry.residual.random / data["confidence"]
        for row in entry.sources:
            size = DEVIATION.get(row.source.kind, lambda _: 0.0)(data["sigma"])
            assert row.share == pytest.approx((row.contribution * size / sigma) ** 2, rel=1e-9)


@given(data=flows())
def test_an_explanation_is_taken_from_the_same_placements(data):
    """A source's part in the overlay is its part in the second layer less that in the first."""
    engine = margins_of(data).engine
    for entry in engine.entries():
        found = explain(engine, *entry.layers, entry.axis)
        for row in found.shared:
            assert row.in_overlay == pytest.approx(row.in_second - row.in_first, rel=1e-9, abs=1e-9)
            assert (row.effect == "cancels") == (row.in_overlay == 0)
        if not entry.chain.one_of_several:
            by_hop = np.array([hop.overlay.random for hop in found.hops])
            assert found.entry.chain_rss == pytest.approx(
                math.sqrt(sum(by_hop**2)), rel=1e-9, abs=1e-13 * scale_of(data, entry)
            )

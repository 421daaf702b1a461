"""Intervals of shares against scipy."""

import pytest
from scipy.stats import binomtest

from flowplan.engine.simulate.intervals import clustered, wilson


@pytest.mark.parametrize(("k", "n"), [(0, 20), (1, 20), (7, 20), (20, 20), (13, 100_000), (99_999, 100_000)])
@pytest.mark.parametrize("confidence", [0.9, 0.95, 0.999])
def test_wilson_as_scipy_has_it(k, n, confidence):
    exact = binomtest(k, n).proportion_ci(confidence, method="wilson")
    assert wilson(k, n, confidence) == pytest.approx(tuple(exact), abs=1e-12)


def test_clusters_that_are_independent_trials_count_as_such():
    share, n = 0.3, 400
    error = (share * (1 - share) / n) ** 0.5
    assert clustered(share, error, 10) == pytest.approx(wilson(share * n, n))


def test_clusters_without_spread_count_once_each():
    assert clustered(1.0, 0.0, 50) == wilson(50, 50)


def test_what_a_simulation_gives_is_the_interval_of_its_counts():
    from tests.simulate.flows import one_pair, simulated

    outcome = simulated(one_pair({"a": 1.0}, 1.5), 5000).pairs[0]
    assert outcome.fail == outcome.fails / 5000
    exact = binomtest(outcome.fails, 5000).proportion_ci(0.95, method="wilson")
    assert outcome.interval == pytest.approx(tuple(exact), abs=1e-12)

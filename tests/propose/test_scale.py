"""A flow of real size is solved with proof, and better than by habit, chance or greed."""

import pytest

from tests.propose.benchmark import measure


@pytest.mark.parametrize("seed", [1, 2])
def test_twenty_five_masks_are_proved_and_beat_greedy_and_random_plans(seed):
    found = measure(25, seed, limit=None)
    assert found.proved
    assert found.best > found.greedy > found.before
    assert found.best > found.random
    assert found.log10_brute_ratio > 20

"""The largest size at which margins hold, against closed forms."""

import math

import numpy as np
import pytest

from flowplan.engine.levers.ramp import Ramp, Varying, largest

NONE = np.zeros((1, 1))


def one(value: float) -> np.ndarray:
    return np.full((1, 1), float(value))


def ramp(room, fixed, still, own, *shared, is_root=True, basis="mixed", row=0) -> Ramp:
    """One row at one site."""
    pairs = tuple((one(u), one(v)) for u, v in shared)
    return Ramp(np.array([row]), one(room), one(fixed), Varying(one(still), one(own), pairs, is_root), basis)


def test_independent_error_may_fill_what_the_others_leave():
    # 10 >= 1 + sqrt(16 + 25 t^2)
    assert largest([ramp(10, 1, 16, 25)]) == pytest.approx(math.sqrt((81 - 16) / 25), rel=1e-12)


def test_rss_takes_bound_and_random_as_squares():
    # 10 >= hypot(6, sqrt(9 + 4 t^2))
    assert largest([ramp(10, 6, 9, 4, basis="rss")]) == pytest.approx(math.sqrt((64 - 9) / 4), rel=1e-12)


def test_plain_sum_is_a_straight_line():
    assert largest([ramp(10, 1, 2, 3, is_root=False)]) == pytest.approx(7 / 3, rel=1e-12)


def test_error_shared_with_another_place_helps_before_it_hurts():
    # |4 - 2 t| + 1 <= 3 holds from t = 1 to t = 3, though not at 0 nor at the size as it is, 4.
    shared = ramp(3, 1, 0, 0, (4, -2), is_root=False)
    assert largest([shared]) == pytest.approx(3, rel=1e-12)
    assert float(shared.at(0)[0, 0]) < 0 < float(shared.at(2)[0, 0])


def test_shared_random_error_is_added_before_it_is_squared():
    # sqrt(9 + (4 - 2 t)^2) <= 5 up to t = 4
    assert largest([ramp(5, 0, 9, 0, (4, -2))]) == pytest.approx(4, rel=1e-12)


def test_the_tightest_of_several_rows_counts():
    rows = [ramp(10, 0, 0, 4), ramp(7, 1, 0, 9, row=1)]
    assert largest(rows) == pytest.approx(2, rel=1e-12)


def test_nothing_helps_when_the_others_take_more_than_there_is():
    assert largest([ramp(3, 1, 9, 1)]) is None


def test_nothing_helps_when_two_rows_ask_for_different_sizes():
    low, high = ramp(1, 0, 0, 2, is_root=False), ramp(1, 0, 0, 0, (4, -2), is_root=False)
    assert largest([low]) == pytest.approx(0.5)
    assert largest([high]) == pytest.approx(2.5)
    assert largest([low, high]) is None


def test_size_that_must_be_gone_altogether():
    assert largest([ramp(3, 3, 0, 5, is_root=False)]) == 0.0


def test_no_row_no_limit():
    assert largest([]) == math.inf


def test_target_leaves_room():
    assert largest([ramp(10, 0, 0, 4)], 4.0) == pytest.approx(3, rel=1e-12)


@pytest.mark.parametrize("side", [-1, 1])
@pytest.mark.parametrize("basis", ["mixed", "rss"])
@pytest.mark.parametrize("is_root", [True, False])
def test_slope_is_the_derivative_from_its_side(side, basis, is_root):
    bent = ramp(10, 2, 3, 1, (4, -2), is_root=is_root, basis=basis)
    for t in (0.5, 2.0, 3.0):
        step = side * 1e-6
        numeric = (bent.at(t + step) - bent.at(t)) / step
        assert bent.slope(t, side) == pytest.approx(numeric, abs=1e-5)


def test_slope_at_the_tip_of_a_lone_random_error_depends_on_the_side():
    alone = ramp(10, 0, 0, 0, (4, -2))
    assert float(alone.slope(2.0, 1)[0, 0]) == pytest.approx(-2)
    assert float(alone.slope(2.0, -1)[0, 0]) == pytest.approx(2)

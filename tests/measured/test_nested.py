"""The split of the variance against statsmodels, dense matrices, and by hand."""

import itertools

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from flowplan.engine.measured.nested import mean_error, split_variance
from tests.measured.rows import batch, tally_of


def split_of(values, lot, wafer, field):
    """Split values with nothing taken off but their mean; one place a field."""
    values, n = np.asarray(values, dtype=float), len(values)
    places = np.column_stack([np.broadcast_to(field, n), np.zeros((n, 3))])
    tally = tally_of(batch(np.column_stack([values, values]), places, lot=lot, wafer=wafer))
    mean = np.zeros(5)
    mean[0] = values.mean()
    return tally, split_variance(tally, mean, 0)


def levels(shape):
    """Return lot, wafer (counted through) and field numbers of a balanced layout."""
    lot, wafer, field, _ = np.indices(shape).reshape(4, -1)
    return lot, lot * shape[1] + wafer, field


def test_two_lots_of_two_wafers_by_hand():
    # Wafer means 1, 3 | 7, 9 of two fields each, which lie 1 either side of them; one site a field.
    # Sums of squares and degrees of freedom: fields 8, 4; wafers 2 (1 + 1 + 1 + 1) = 8, 2; lots 4 (9 + 9)
    # = 72, 1. Mean squares 2, 4, 72. So field 2, wafer (4 - 2) / 2 = 1, lot (72 - 4) / 4 = 17.
    values = [0, 2, 2, 4, 6, 8, 8, 10]
    _, split = split_of(values, [0] * 4 + [1] * 4, [0, 0, 1, 1, 2, 2, 3, 3], [0, 1] * 4)
    assert (split.lot, split.wafer, split.field) == pytest.approx((17, 1, 2))
    assert split.site is None  # one site a field does not tell the site from the field


def test_components_of_equal_numbers_are_those_of_statsmodels_reml():
    shape = (8, 4, 6, 1)
    rng = np.random.default_rng(3)
    lot, wafer, field = levels(shape)
    values = rng.normal(0, 6, 8)[lot] + rng.normal(0, 4, 32)[wafer] + rng.normal(0, 2, lot.size)
    _, split = split_of(values, lot, wafer, field)
    frame = pd.DataFrame({"v": values, "lot": lot, "wafer": wafer})
    model = sm.MixedLM.from_formula(
        "v ~ 1", groups="lot", re_formula="1", vc_formula={"wafer": "0 + C(wafer)"}, data=frame
    )
    found = model.fit(reml=True)
    assert split.lot == pytest.approx(float(found.cov_re.iloc[0, 0]), rel=1e-3)
    assert split.wafer == pytest.approx(float(found.vcomp[0]), rel=1e-3)
    assert split.field == pytest.approx(float(found.scale), rel=1e-3)


@pytest.mark.parametrize("seed", range(3))
def test_unequal_numbers_have_the_expected_sums_of_squares_of_dense_matrices(seed):
    rng = np.random.default_rng(seed)
    n = 60
    lot = rng.integers(0, 4, n)
    wafer = lot * 3 + rng.integers(0, 3, n)
    field = rng.integers(0, 3, n)
    values = rng.normal(0, 5, n)
    _, split = split_of(values, lot, wafer, field)
    groups = [np.zeros(n, dtype=int), lot, wafer, wafer * 3 + field, np.arange(n)]
    members = [np.equal.outer(g, np.unique(g)).astype(float) for g in groups]
    project = [z @ np.diag(1 / z.sum(axis=0)) @ z.T for z in members]
    between = [b - a for a, b in itertools.pairwise(project)]
    squares = np.array([values @ form @ values for form in between])
    expected = np.array([[np.trace(form @ z @ z.T) for z in members[1:]] for form in between])
    assert [split.lot, split.wafer, split.field, split.site] == pytest.approx(
        np.linalg.solve(expected, squares)
    )


def test_four_levels_come_back_on_average():
    shape, sizes = (30, 6, 8, 4), (5.0, 3.0, 2.0, 1.0)
    rng = np.random.default_rng(11)
    lot, wafer, field = levels(shape)
    numbers = (lot, wafer, wafer * shape[2] + field, np.arange(lot.size))
    values = sum(rng.normal(0, s, number.max() + 1)[number] for s, number in zip(sizes, numbers, strict=True))
    _, split = split_of(values, lot, wafer, field)
    # The standard error of a variance from n draws is its sqrt(2/n); four of them are allowed.
    assert split.lot == pytest.approx(25, abs=4 * 25 * np.sqrt(2 / 29) * 1.1)
    assert split.wafer == pytest.approx(9, abs=4 * 9 * np.sqrt(2 / 150) * 1.2)
    assert split.field == pytest.approx(4, abs=4 * 4 * np.sqrt(2 / 1260) * 1.2)
    assert split.site == pytest.approx(1, abs=4 * 1 * np.sqrt(2 / 4320))


def test_what_cannot_be_told_is_none_and_counts_for_the_level_above():
    _, one_lot = split_of([0, 2, 4, 6], [0] * 4, [0, 0, 1, 1], [0, 1, 0, 1])
    assert one_lot.lot is None
    assert one_lot.wafer == pytest.approx((16 - 2) / 2)  # mean squares 16 and 2
    _, one_wafer_each = split_of([0, 2, 4, 6], [0, 0, 1, 1], [0, 0, 1, 1], [0, 1, 0, 1])
    assert one_wafer_each.wafer is None
    assert one_wafer_each.lot == pytest.approx((16 - 2) / 2)


def test_the_error_of_the_mean_is_that_of_the_wafer_means():
    # With equal numbers and one lot it is the scatter of wafer means over the root of their number.
    rng = np.random.default_rng(5)
    wafer = np.repeat(np.arange(12), 10)
    values = rng.normal(0, 4, 12)[wafer] + rng.normal(0, 1, 120)
    tally, split = split_of(values, [0] * 120, wafer, np.tile(np.arange(10), 12))
    means = values.reshape(12, 10).mean(axis=1)
    assert mean_error(tally, split) == pytest.approx(means.std(ddof=1) / np.sqrt(12))


def test_one_wafer_says_nothing_about_the_error_of_the_mean():
    tally, split = split_of([1, 2, 4], [0] * 3, [0] * 3, [0, 1, 2])
    assert mean_error(tally, split) is None

"""Rows in any order and any batches give the same sums; outliers by hand."""

import numpy as np
import pytest

from flowplan.engine.measured.batch import group_medians, groups_of
from flowplan.engine.measured.robust import deviations, ratios, robust_pattern, robust_sigma
from flowplan.engine.measured.tally import Ledger
from flowplan.engine.points import basis_at
from tests.measured.rows import batch, grid, tally_of


@pytest.fixture
def rows():
    """Two readings, two lots of three wafers, five by five fields of nine sites."""
    rng = np.random.default_rng(2)
    places = grid(2, 20.0, 8.0)
    blocks = [(r, lot, w) for r in (0, 1) for lot in (0, 1) for w in range(3)]
    numbers = np.repeat(blocks, len(places), axis=0)
    overlay = rng.normal(0, 4, (len(numbers), 2)) + numbers[:, 2:] * 3
    overlay[100] += 400
    wafer = numbers[:, 1] * 3 + numbers[:, 2]
    return batch(
        overlay, np.tile(places, (len(blocks), 1)), reading=numbers[:, 0], lot=numbers[:, 1], wafer=wafer
    )


def sums_of(tally):
    return (
        tally.rows,
        tally.by_field,
        tally.by_wafer,
        tally.by_lot(),
        tally.fields_per_wafer,
        tally.n_fields,
    )


def test_the_order_of_rows_does_not_matter(rows):
    mixed = rows.take(np.random.default_rng(1).permutation(len(rows)))
    whole, other = Ledger(), Ledger()
    whole.add(rows)
    other.add(mixed)
    for reading in (0, 1):
        assert other.tallies[reading].n_outliers == whole.tallies[reading].n_outliers == (reading == 0)
        for a, b in zip(sums_of(whole.tallies[reading]), sums_of(other.tallies[reading]), strict=True):
            assert b == pytest.approx(a, rel=1e-6, abs=1e-6)


def test_batches_of_whole_wafers_add_up_to_the_whole(rows):
    whole, parts = Ledger(None), Ledger(None)
    whole.add(rows)
    for wafers in ((0, 4), (1, 2, 3, 5)):
        parts.add(rows.take(np.flatnonzero(np.isin(rows.wafer, wafers))))
    for reading in (0, 1):
        a, b = whole.tallies[reading], parts.tallies[reading]
        # What each ledger takes off first differs; the sums of places do not.
        assert b.rows[:5, :5] == pytest.approx(a.rows[:5, :5])
        assert b.by_lot()[:5, :5] == pytest.approx(a.by_lot()[:5, :5])
        assert (b.n, b.n_wafers, b.n_fields) == (a.n, a.n_wafers, a.n_fields) == (1350, 6, 150)


def test_rows_that_stand_together_are_not_moved(rows):
    for reading, group in groups_of(rows):
        assert (np.diff(group.rows.row) == 1).all()
        assert len(group.field_starts) == 150
        assert len(group.wafer_starts) == 6
        assert (group.rows.reading == reading).all()


def test_group_medians_are_those_of_numpy():
    values = np.random.default_rng(0).normal(size=(17, 2))
    starts = np.array([0, 4, 5, 12])
    expected = [np.median(part, axis=0) for part in np.split(values, starts[1:])]
    assert group_medians(values, starts) == pytest.approx(np.array(expected))


def test_an_outlier_by_hand():
    # One wafer at one place: median 10, absolute deviations 1 0 1 2 90 2 0 -> median 1, sigma 1.4826.
    x = np.array([9.0, 10, 11, 12, 100, 8, 10])
    away = deviations(np.column_stack([x, np.zeros(7)]), np.array([0]))
    sigma = robust_sigma(away)
    assert sigma == pytest.approx([1.4826, 0], rel=1e-4)
    # The modified z-score of the NIST/SEMATECH handbook 1.3.5.17 is 0.6745 (x - median) / MAD.
    assert ratios(away, sigma) == pytest.approx(0.6745 * np.abs(x - 10), rel=1e-4)
    assert tally_of(batch(np.column_stack([x, np.zeros(7)])), limit=3.5).n_outliers == 1
    assert tally_of(batch(np.column_stack([x, np.zeros(7)])), limit=None).n_outliers == 0


def test_a_wafer_that_is_off_as_a_whole_is_no_outlier(rows):
    rows.overlay[rows.wafer == 4] += 5000
    ledger = Ledger()
    ledger.add(rows)
    assert ledger.tallies[0].n_outliers == 1
    assert ledger.tallies[1].n_outliers == 0


def test_outliers_are_listed_with_their_row_the_farthest_first(rows):
    rows.overlay[700, 1] -= 900
    ledger = Ledger()
    ledger.add(rows)
    assert [(o.row, o.reading) for o in ledger.outliers] == [(700, 0), (100, 0)]
    assert ledger.outliers[0].ratio > ledger.outliers[1].ratio > 50


def test_where_most_rows_are_alike_nothing_is_an_outlier():
    values = np.zeros((20, 2))
    values[3] = 50
    assert tally_of(batch(values), limit=6).n_outliers == 0


def test_the_pattern_withstands_a_tenth_of_wild_rows():
    rng = np.random.default_rng(4)
    basis = basis_at(grid(3, 20.0, 8.0))
    truth = np.array([[10.0, -4], [0.5, 0], [0, 0.3], [0.2, -0.1], [0, 0.1]])
    overlay = basis.T @ truth + rng.normal(0, 1, (basis.shape[1], 2))
    overlay[::10] += 1e4
    robust = robust_pattern(basis, overlay)
    plain = np.linalg.lstsq(basis.T, overlay, rcond=None)[0]
    assert np.abs(robust - truth).max() < 0.4
    assert np.abs(plain - truth).max() > 100


def test_an_empty_batch_adds_nothing():
    ledger = Ledger(6)
    ledger.add(batch(np.zeros((0, 2))))
    assert ledger.tallies == {}

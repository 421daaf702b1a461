"""Fields of wafers: what repeats where, and which fields hold, against probabilities by hand."""

import numpy as np
import pytest
from scipy import stats

from flowplan.engine.simulate.fields import LOTS, WAFERS, mask_sets, spreads
from tests.simulate.flows import holds, one_pair, simulated

WAFER = {"wafer": {"diameter": "100 mm"}, "field": {"x": "20 mm", "y": "20 mm"}}
LIMIT = 1.5
SHARE = 1 - 2 * stats.norm.sf(LIMIT)


def fields_of(term, limit=LIMIT, samples=20_000, **options):
    return simulated(one_pair({"t": term}, limit, **WAFER), samples, **options).fields


def varying(level):
    return fields_of({"random": 1.0, "varies": level})


def test_nested_wafers_enough_for_the_samples():
    fields = varying("field")
    assert fields.per_wafer.shape == (mask_sets(len(fields.centres), 20_000), LOTS, WAFERS)
    assert fields.per_wafer.size * len(fields.centres) >= 20_000


@pytest.mark.parametrize(("level", "per_set"), [("mask", 1), ("lot", LOTS), ("wafer", LOTS * WAFERS)])
def test_what_repeats_in_every_field_makes_wafers_all_good_or_all_bad(level, per_set):
    fields = varying(level)
    total = len(fields.centres)
    good = fields.per_wafer.reshape(len(fields.per_wafer), -1)
    assert set(np.unique(good)) == {0, total}
    different = good.reshape(len(good), per_set, -1)
    assert (different == different[:, :, :1]).all()
    if per_set > 1:
        assert (different[:, 0, 0] != different[:, -1, 0]).any()
    assert holds(SHARE, float((different[:, :, 0] > 0).mean()), different[:, :, 0].size)


def test_what_is_drawn_by_field_spreads_as_a_binomial():
    fields = varying("field")
    n, total = fields.per_wafer.size, len(fields.centres)
    assert holds(SHARE, fields.share, n * total)
    variance = fields.per_wafer.var(ddof=1)
    exact = total * SHARE * (1 - SHARE)
    assert variance == pytest.approx(exact, rel=4.2 * np.sqrt(2 / n))


@pytest.mark.parametrize("level", ["mask", "lot", "wafer"])
def test_spread_is_found_at_its_own_level(level):
    fields = varying(level)
    exact = len(fields.centres) * np.sqrt(SHARE * (1 - SHARE))
    assert fields.spread[level] == pytest.approx(exact, rel=0.2)
    assert all(v < 0.35 * exact for k, v in fields.spread.items() if k != level)


def test_spreads_by_hand():
    """Two mask sets of two lots of two wafers: mean squares 1/2, 1 and 32 by wafer, lot and mask set."""
    values = np.array([[[0, 1], [1, 2]], [[4, 5], [5, 6]]])
    # wafers of a lot differ by 1: variance 1/2; lot means differ by 1: variance 1/2, less 1/2 of 1/2;
    # mask-set means differ by 4: variance 8, less half of the lots' 1/2
    assert spreads(values) == pytest.approx({"wafer": 0.5**0.5, "lot": 0.25**0.5, "mask": 7.75**0.5})


def test_a_rotation_in_the_field_counts_at_the_worst_corner():
    """theta * half the height [urad * mm = nm], redrawn in each field."""
    fields = fields_of({"random": "0.1 urad", "shape": "rotation"})
    exact = 1 - 2 * stats.norm.sf(LIMIT / (0.1 * 10))
    assert holds(exact, fields.share, fields.per_wafer.size * len(fields.centres))


def test_a_scale_over_the_wafer_costs_the_outer_fields_first():
    fields = fields_of({"random": "0.05 ppm", "shape": "scale", "over": "wafer"})
    reach = np.abs(fields.centres[:, 0]) + 10
    exact = 1 - 2 * stats.norm.sf(LIMIT / (0.05 * reach))
    assert len(np.unique(exact)) > 1
    assert all(holds(e, g, fields.per_wafer.size) for e, g in zip(exact, fields.good, strict=True))


def test_what_varies_by_wafer_fails_outside_in():
    """One scale a wafer: the share of good fields is that of all fields with |X| + 10 mm below one reach."""
    fields = fields_of({"random": "0.05 ppm", "shape": "scale", "over": "wafer"})
    reach = np.abs(fields.centres[:, 0]) + 10
    possible = {0, *(int((reach <= r).sum()) for r in reach)}
    assert set(np.unique(fields.per_wafer)) <= possible


def test_a_shaped_bound_at_its_worst_sign_always_fails_the_same_fields():
    fields = fields_of({"bound": "0.05 ppm", "shape": "scale", "over": "wafer"}, limit=1.2)
    reach = np.abs(fields.centres[:, 0]) + 10
    assert fields.good.tolist() == (0.05 * reach <= 1.2).astype(float).tolist()
    assert 0 < fields.good.mean() < 1


def test_a_bound_drawn_uniformly_is_the_same_on_every_wafer_of_a_mask_set():
    term = {"bound": "0.1 ppm", "shape": "scale", "over": "wafer"}
    fields = fields_of(term, limit=1.6, bounds="uniform")
    assert (fields.per_wafer == fields.per_wafer[:, :1, :1]).all()
    reach = np.abs(fields.centres[:, 0]) + 10
    exact = np.minimum(1, 1.6 / (0.1 * reach))
    n = len(fields.per_wafer)
    assert all(holds(e, g, n) for e, g in zip(exact, fields.good, strict=True))


def test_a_known_offset_over_the_wafer_counts_at_its_place():
    term = {"offset": "0.05 ppm", "shape": "scale", "over": "wafer"}
    fields = fields_of(term, limit=1.2)
    reach = np.abs(fields.centres[:, 0]) + 10
    assert 0 < fields.good.mean() < 1
    assert fields.good.tolist() == (0.05 * reach <= 1.2).astype(float).tolist()


def test_a_margin_of_exactly_nothing_holds_in_every_field():
    """0.1 + 0.2 against 0.3: rounding must not fail it."""
    fields = fields_of({"bound": 0.1, "offset": 0.2}, limit=0.3)
    assert fields.good.tolist() == [1.0] * len(fields.centres)


def test_without_a_field_size_the_wafer_is_one():
    found = simulated(one_pair({"t": 1.0}, LIMIT), 20_000)
    assert found.fields.centres.tolist() == [[0.0, 0.0]]
    assert holds(SHARE, found.fields.share, found.fields.per_wafer.size)

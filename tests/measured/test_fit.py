"""The linear fit against certified values, statsmodels, and what the places can tell."""

import numpy as np
import pytest
import statsmodels.api as sm

from flowplan.engine.measured.fit import linear_fit
from tests.measured.rows import batch, grid, tally_of

#: NIST/ITL Statistical Reference Datasets, linear regression, data set Norris (36 points, y on x).
NORRIS_X = [
    0.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777.0, 558.2, 0.4, 0.6, 775.5, 666.9, 338.0,
    447.5, 11.6, 556.0, 228.1, 995.8, 887.6, 120.2, 0.3, 0.3, 556.8, 339.1, 887.2, 999.0, 779.0, 11.1, 118.3,
    229.2, 669.1, 448.9, 0.5,
]  # fmt: skip
NORRIS_Y = [
    0.1, 338.8, 118.1, 888.0, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, 0.3, 0.1, 778.1, 668.8, 339.3,
    448.9, 10.8, 557.7, 228.3, 998.0, 888.8, 119.6, 0.3, 0.6, 557.6, 339.3, 888.0, 998.5, 778.9, 10.2, 117.6,
    228.9, 668.4, 449.2, 0.2,
]  # fmt: skip


def fit_of(rows):
    tally = tally_of(rows)
    return linear_fit(tally.rows, tally.pattern)


def test_norris_gives_the_certified_values():
    n = len(NORRIS_X)
    places = np.column_stack([NORRIS_X, np.zeros((n, 3))])
    fit = fit_of(batch(np.column_stack([NORRIS_Y, np.zeros(n)]), places))
    assert fit.wafer["shift_x"] == pytest.approx(-0.262323073774029, rel=1e-9)
    assert fit.wafer["scale_x"] == pytest.approx(1.00211681802045, rel=1e-9)
    assert fit.wafer_errors["shift_x"] == pytest.approx(0.232818234301152, rel=1e-9)
    assert fit.wafer_errors["scale_x"] == pytest.approx(0.429796848199937e-3, rel=1e-9)
    assert fit.residual[0] == pytest.approx(0.884796396144373, rel=1e-9)


def test_all_ten_terms_come_back_from_exact_data():
    places = grid(2, 20.0, 8.0)
    X, Y, x, y = places.T
    wx, wy = X + x, Y + y
    tx, ty, sx, sy, rot, skew, mag, turn, mag_a, turn_a = 5, -7, 0.4, -0.3, 0.2, 0.15, 2, -1.5, 0.7, 0.9
    dx = tx + sx * wx - (rot + skew) * wy + (mag + mag_a) * x - (turn + turn_a) * y
    dy = ty + sy * wy + rot * wx + (mag - mag_a) * y + (turn - turn_a) * x
    fit = fit_of(batch(np.column_stack([dx, dy]), places))
    assert list(fit.wafer.values()) == pytest.approx([tx, ty, sx, sy, rot, skew], abs=1e-9)
    assert list(fit.field.values()) == pytest.approx([mag, turn, mag_a, turn_a], abs=1e-9)
    assert fit.residual == pytest.approx([0, 0], abs=1e-6)


@pytest.mark.parametrize("seed", range(4))
def test_values_and_errors_are_those_of_statsmodels(seed):
    rng = np.random.default_rng(seed)
    places = np.column_stack([rng.normal(0, 50, (80, 2)), rng.uniform(-9, 9, (80, 2))])
    X, Y, x, y = places.T
    design = np.column_stack([np.ones(80), x, y, X + x, Y + y])
    overlay = design @ rng.normal(0, 1, (5, 2)) + rng.normal(0, [3.0, 5.0], (80, 2))
    fit = fit_of(batch(overlay, places))
    along = [sm.OLS(overlay[:, axis], design).fit() for axis in (0, 1)]
    assert fit.coefficients == pytest.approx(np.column_stack([a.params for a in along]))
    assert fit.residual == pytest.approx([np.sqrt(a.mse_resid) for a in along])
    bx, by = (a.params for a in along)
    ex, ey = (a.bse for a in along)
    assert fit.wafer["skew"] == pytest.approx(-bx[4] - by[3])
    assert fit.wafer_errors["skew"] == pytest.approx(np.hypot(ex[4], ey[3]))
    assert fit.field["magnification_asymmetry"] == pytest.approx((bx[1] - by[2]) / 2)
    assert fit.field_errors["rotation"] == pytest.approx(np.hypot(ey[1], ex[2]) / 2)


def test_with_one_site_a_field_nothing_is_said_about_fields():
    places = grid(2, 20.0, 0.0)[::9]
    fit = fit_of(batch(places[:, :2] * 0.5 + 3, places))
    assert fit.wafer["scale_x"] == pytest.approx(0.5)
    assert set(fit.field.values()) == set(fit.field_errors.values()) == {None}


def test_with_one_field_its_own_terms_are_found_and_none_of_the_wafer():
    places = grid(0, 20.0, 8.0) + np.array([30, -10, 0, 0])
    fit = fit_of(batch(places[:, 2:] * 2 + 3, places))
    assert fit.field["magnification"] == pytest.approx(2)
    assert fit.wafer["shift_x"] == pytest.approx(3)
    assert [fit.wafer[name] for name in ("scale_x", "scale_y", "rotation", "skew")] == [None] * 4


def test_fields_in_one_row_do_not_tell_what_varies_along_y():
    places = np.array([(X, 0, 0, 0) for X in (-40, -20, 0, 20, 40)])
    fit = fit_of(batch(np.column_stack([places[:, 0] * 0.3, places[:, 0] * 0.1]), places))
    assert fit.wafer["scale_x"] == pytest.approx(0.3)
    assert fit.wafer["rotation"] == pytest.approx(0.1)
    assert fit.wafer["scale_y"] is None
    assert fit.wafer["skew"] is None


def test_fields_on_a_diagonal_leave_every_term_of_position_open():
    places = np.array([(X, X, 0, 0) for X in (-40, -20, 0, 20, 40)])
    fit = fit_of(batch(places[:, :2] * 0.3 + 4, places))
    assert fit.wafer["shift_x"] == pytest.approx(4)
    assert [fit.wafer[name] for name in ("scale_x", "scale_y", "rotation", "skew")] == [None] * 4


def test_a_single_row_has_no_residual_and_no_error():
    fit = fit_of(batch([[3.0, 4.0]]))
    assert fit.wafer["shift_x"] == pytest.approx(3)
    assert np.isnan(fit.residual).all()
    assert fit.wafer_errors["shift_x"] is None

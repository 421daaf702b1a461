"""The overlap of two intervals, against what can be worked out by hand and against scipy."""

import numpy as np
import pytest
from scipy import integrate, stats

from flowplan.engine.landing.area import LandedArea
from flowplan.engine.landing.normal import cumulative
from flowplan.engine.landing.overlap import Interval
from tests.landing.material import still

AREA = 600.0 * 600.0


def along_x(axis: Interval) -> LandedArea:
    """Nothing happens along y, where the contact lands wholly."""
    return LandedArea.of(AREA, axis, still(), 0.0)


def test_the_normal_distribution_is_that_of_scipy():
    x = np.linspace(-9, 9, 4001)
    assert cumulative(x) == pytest.approx(stats.norm.cdf(x), abs=2e-12)
    assert cumulative(np.array([-np.inf, np.inf])).tolist() == pytest.approx([0, 1], abs=1e-17)


@pytest.mark.parametrize("mean", [0.0, 35.0, -180.0])
@pytest.mark.parametrize("share", [0.02, 0.4, 0.7, 0.95])
def test_without_cd_the_overlap_is_the_room_less_a_normal_displacement(mean, share):
    # by hand: L = min(600, 800 - |e|), so L < l < 600 where |e| > 800 - l
    room, sigma = 800 - share * 600, 90.0
    by_hand = stats.norm.sf((room - mean) / sigma) + stats.norm.cdf((-room - mean) / sigma)
    assert along_x(still(mean, sigma)).less(share) == pytest.approx(by_hand, rel=1e-4, abs=1e-9)


def test_without_cd_part_of_the_contacts_land_wholly():
    # by hand: the contact lands wholly where |e| <= (1000 - 600) / 2
    area = along_x(still(0.0, 90.0))
    assert area.less(1.0) == pytest.approx(2 * stats.norm.sf(200 / 90), rel=1e-4)
    assert area.less(1.0 + 1e-5) == pytest.approx(1.0)


def test_the_mean_overlap_of_displaced_intervals():
    # E min(600, 800 - |e|) = 600 - 2 * (sigma * phi(k) - 200 * (1 - Phi(k))) with k = 200 / sigma
    sigma, k = 150.0, 200 / 150
    by_hand = 600 - 2 * (sigma * stats.norm.pdf(k) - 200 * stats.norm.sf(k))
    # and what is beyond a complete miss, which counts as 0 instead of below it
    k = 800 / sigma
    by_hand += 2 * (sigma * stats.norm.pdf(k) - 800 * stats.norm.sf(k))
    assert along_x(still(0.0, sigma)).mean() * 600 == pytest.approx(by_hand, rel=1e-6)


def test_without_displacement_the_narrower_of_two_varying_widths_counts():
    # by hand: L = 2 min(u, v) with u = 300 +- 10, v = 305 +- 15 independent
    axis = still(0.0, 0.0, 600, 610, var_contact=100.0, var_pad=225.0)
    for length in (560.0, 590.0, 605.0):
        by_hand = 1 - stats.norm.sf((length / 2 - 300) / 10) * stats.norm.sf((length / 2 - 305) / 15)
        assert along_x(axis).less(length / 600) == pytest.approx(by_hand, rel=1e-4)


def double_integral(correlation: float, length: float) -> float:
    """P(L > length) with e = 20 +- 60, u = 300 +- 12 and v = 320 +- 15, over u and then v by scipy."""

    def given(v: float, u: float) -> float:
        room = u + v - length
        return float(stats.norm.cdf((room - 20) / 60) - stats.norm.cdf((-room - 20) / 60))

    rest = (1 - correlation**2) ** 0.5
    lowest = (length / 2 - 300) / 12
    if not rest:
        # v follows from u: 320 + 15 * correlation * z must be above l / 2 as well
        v_bound = (length / 2 - 320) / 15 * correlation
        ends = (max(lowest, v_bound), 9.0) if correlation > 0 else (lowest, v_bound)

        def along(z: float) -> float:
            return float(stats.norm.pdf(z)) * given(320 + 15 * correlation * z, 300 + 12 * z)

        return integrate.quad(along, *np.clip(ends, -9, 9), epsabs=1e-12)[0]

    def both(z2: float, z1: float) -> float:
        v = 320 + 15 * (correlation * z1 + rest * z2)
        return float(np.exp(-(z1**2 + z2**2) / 2) / (2 * np.pi)) * given(v, 300 + 12 * z1)

    def least(z1: float) -> float:
        return float(np.clip(((length / 2 - 320) / 15 - correlation * z1) / rest, -9, 9))

    return integrate.dblquad(both, max(lowest, -7), 7, least, 9, epsabs=1e-8, epsrel=1e-6)[0]


@pytest.mark.parametrize("correlation", [-1.0, -0.6, 0.0, 1.0])
def test_varying_widths_and_displacement_against_a_double_integral(correlation):
    axis = still(20.0, 60.0, 600, 640, var_contact=144.0, var_pad=225.0, covariance=180.0 * correlation)
    lengths = (500.0, 570.0) if abs(correlation) == 1 else (570.0,)
    for length in lengths:
        by_scipy = 1 - double_integral(correlation, length)
        assert along_x(axis).less(length / 600) == pytest.approx(by_scipy, rel=2e-4)


def test_both_axes_without_cd_against_scipy_quadrature():
    x, y = still(0.0, 60.0, 600, 700), still(-10.0, 50.0, 600, 680)
    area = LandedArea.of(AREA, x, y, 0.0)

    def holds(share: float) -> float:
        def given(e: float) -> float:
            room = 640 - share * AREA / min(600.0, 650 - abs(e))
            both = stats.norm.cdf((room + 10) / 50) - stats.norm.cdf((-room + 10) / 50)
            return float(stats.norm.pdf(e, 0, 60) * both)

        ends = (0, 50), (50, 650 - share * 600)
        return 2 * sum(integrate.quad(given, *end, epsabs=1e-13)[0] for end in ends)

    for share in (0.5, 0.7, 0.9, 0.99):
        assert area.less(share) == pytest.approx(1 - holds(share), rel=1e-4, abs=1e-9)


@pytest.mark.parametrize("correlation", [0.05, 0.3, -0.6, 0.9])
def test_correlated_displacements_against_a_double_quadrature(correlation):
    # both axes: L = min(600, 650 - |e|), e = +-60 each, correlated
    axis = still(0.0, 60.0, 600, 700)
    area = LandedArea.of(AREA, axis, axis, correlation * 3600)
    rest = 60 * (1 - correlation**2) ** 0.5
    e = np.linspace(-470, 470, 8001)
    wide = np.clip(650 - np.abs(e), 0, 600)
    for share in (0.6, 0.8):
        room = 650 - share * AREA / wide
        mean = correlation * e
        given = stats.norm.cdf((room - mean) / rest) - stats.norm.cdf((-room - mean) / rest)
        fits = (share * AREA / wide <= 600) & (room > 0)
        holds = integrate.trapezoid(np.where(fits, given, 0) * stats.norm.pdf(e, 0, 60), e)
        assert area.less(share) == pytest.approx(1 - holds, rel=2e-3, abs=1e-7)


def test_quantiles_turn_the_distribution_round():
    axis = still(10.0, 70.0, 600, 700, var_contact=100.0, var_pad=150.0)
    area = LandedArea.of(AREA, axis, still(0.0, 50.0, 600, 660), 800.0)
    for probability in (0.00135, 0.01, 0.5, 0.99):
        assert area.less(area.quantile(probability)) == pytest.approx(probability, rel=1e-4)

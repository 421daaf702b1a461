"""The fit's covariance against statsmodels, closed forms, geometry by hand and its own simulation."""

import math

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import assume, given
from hypothesis import strategies as st

from flowplan.engine.analysis import Engine
from flowplan.engine.marksites import covariance, scalars
from flowplan.model.marksites import MarkSites
from tests.marksites.material import (
    GEOMETRY,
    SIZES,
    alignment,
    design,
    one_reading,
    placed_covariance,
    regressors,
    ring,
)
from tests.support.flows import flow_of

UNEVEN = [(-41.0, 12.0), (8.5, -37.0), (33.0, 30.0), (50.0, -7.0), (-12.0, 44.0)]
POINTS = [(0.0, 0.0), (17.0, -5.0), (-40.0, 31.0), (3.0, 58.0)]


def sites_of(*args, **kwargs) -> MarkSites:
    return MarkSites.model_validate(alignment(*args, **kwargs))


# -- statsmodels: OLS of the same readings ---------------------------------------------------------


@pytest.mark.parametrize("model", SIZES)
@pytest.mark.parametrize("places", [UNEVEN, ring(8, 55.0).tolist()], ids=["uneven", "ring"])
def test_parameters_vary_as_statsmodels_says(model, places):
    """OLS covariance of statsmodels at a known variance of the readings."""
    rows = design(model, places)
    fit = sm.OLS(np.arange(len(rows)) % 7, rows).fit()
    expected = fit.cov_params(scale=30.0**2)
    found = covariance(sites_of(places, model), "nm", (30.0**2, 30.0**2))
    assert found == pytest.approx(expected, rel=1e-9, abs=1e-9 * np.abs(expected).max())


@pytest.mark.parametrize("model", SIZES)
def test_the_margin_map_is_the_prediction_variance_of_statsmodels(model):
    """At every site of every field: sqrt(var_pred_mean) of statsmodels' OLS, at a known variance."""
    engine = Engine.of(flow_of(one_reading(alignment(UNEVEN, model))))
    rows = design(model, UNEVEN)
    fit = sm.OLS(np.arange(len(rows)) % 7, rows).fit()
    positions = engine.sites.positions[:, :2] + engine.sites.positions[:, 2:]
    for entry, regressor in zip(engine.entries(), regressors(model, positions), strict=True):
        predicted = fit.get_prediction(regressor).var_pred_mean / fit.scale
        (margins,) = engine.margin_map([entry])
        assert -margins == pytest.approx(30.0 * np.sqrt(predicted), rel=1e-9)
    assert engine.sites.n_points == (1 if model == "shift" else 9 * engine.sites.n_fields)


# -- by hand ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("length", [20.0, 100.0])
@pytest.mark.parametrize("turn", [0.0, 0.7])
def test_two_marks_at_a_distance_turn_by_root_two_sigma_over_length(length, turn):
    """By hand: each end moves by sigma across the line, the angle by sqrt(2) sigma / L; nm/mm are urad."""
    end = (length / 2 * math.cos(turn), length / 2 * math.sin(turn))
    sites = sites_of([end, (-end[0], -end[1])])
    rotation = covariance(sites, "nm", (30.0**2, 30.0**2))[2, 2]
    assert math.sqrt(rotation) == pytest.approx(math.sqrt(2) * 30 / length, rel=1e-12)


def test_two_marks_on_x_read_differently_turn_by_what_is_read_along_y():
    """By hand: marks on the x axis show a rotation along y alone."""
    sites = sites_of([(25.0, 0.0), (-25.0, 0.0)])
    rotation = covariance(sites, "nm", (40.0**2, 20.0**2))[2, 2]
    assert math.sqrt(rotation) == pytest.approx(math.sqrt(2) * 20 / 50, rel=1e-12)


@pytest.mark.parametrize("count", [3, 4, 7, 16])
def test_a_ring_has_closed_forms(count):
    """By hand: sums of x^2 and of y^2 over a ring are n r^2 / 2, of x, y and x y 0."""
    found = np.sqrt(np.diag(covariance(sites_of((count, 50.0), "linear"), "nm", (30.0**2, 30.0**2))))
    shift, slope = 30 / math.sqrt(count), 30 / (50 * math.sqrt(count / 2))
    assert found == pytest.approx([shift, shift, slope, slope, slope, math.sqrt(2) * slope], rel=1e-12)
    rigid = np.sqrt(np.diag(covariance(sites_of((count, 50.0), "rigid+scale"), "nm", (30.0**2, 30.0**2))))
    assert rigid == pytest.approx([shift, shift, 30 / (50 * math.sqrt(count)), 30 / (50 * math.sqrt(count))])


def test_a_shift_alone_is_the_mean_of_the_marks_wherever_they_stand():
    found = covariance(sites_of(UNEVEN, "shift"), "nm", (40.0**2, 20.0**2))
    assert found == pytest.approx(np.diag([40.0**2 / 5, 20.0**2 / 5]))


def test_crosses_in_opposite_corners_of_the_field_fix_shift_and_rotation():
    """Two crosses in opposite corners fix x, y and rotation: common practice, no source."""
    corners = [(6.5, 5.5), (-6.5, -5.5)]
    data = one_reading(alignment(corners, over="field"))
    across = math.hypot(13, 11)
    at_corner = placed_covariance(data, [corners[0]], over="field")
    turned = math.sqrt(2) * 30 / across
    assert np.diag(at_corner) == pytest.approx([450 + (turned * 5.5) ** 2, 450 + (turned * 6.5) ** 2])


# -- by simulation of the fit itself ---------------------------------------------------------------


@pytest.mark.parametrize("model", ["rigid", "rigid+scale", "linear"])
def test_fits_to_drawn_readings_spread_as_the_sources_do(model):
    """Marks read 40 nm along x and 20 nm along y, fitted by numpy's lstsq 20000 times."""
    rng = np.random.default_rng(20)
    rows = design(model, UNEVEN)
    sizes = np.repeat([40.0, 20.0], len(UNEVEN))[:, None]
    readings = sizes * rng.standard_normal((len(rows), 20_000))
    fitted, *_ = np.linalg.lstsq(rows, readings, rcond=None)
    moved = design(model, POINTS) @ fitted
    data = one_reading(alignment(UNEVEN, model, {"x": 40, "y": 20}))
    expected = placed_covariance(data, POINTS)
    # The standard error of a covariance of n draws is at most sqrt(2 / n) of the variances: 1 %.
    scale = np.sqrt(np.outer(np.diag(expected), np.diag(expected)))
    assert np.cov(moved) / scale == pytest.approx(expected / scale, abs=0.04)


def test_a_sum_of_uniform_readings_has_their_variance():
    """A half-width a has the variance a^2 / 3 (JCGM 100:2008, 4.3.7)."""
    uniform = one_reading(alignment(UNEVEN, "linear", {"uniform": 30}))
    random = one_reading(alignment(UNEVEN, "linear", 30))
    assert placed_covariance(uniform, POINTS) == pytest.approx(placed_covariance(random, POINTS) / 3)


# -- at any sites ----------------------------------------------------------------------------------

coordinates = st.integers(-40, 40).map(float)
places = st.lists(st.tuples(coordinates, coordinates), min_size=3, max_size=7, unique=True)


@given(
    places=places,
    points=st.lists(st.tuples(coordinates, coordinates), min_size=1, max_size=3),
    model=st.sampled_from(list(SIZES)),
    read=st.tuples(st.sampled_from([5.0, 20.0]), st.sampled_from([5.0, 20.0])),
    over=st.sampled_from(["wafer", "field"]),
)
def test_placements_covary_as_the_fit_says(places, points, model, read, over):
    """Covariance between any two points and axes is a(x1)^T C a(x2), C from the normal equations."""
    rows = design(model, places)
    assume(np.linalg.cond(rows / np.linalg.norm(rows, axis=0)) < 1e3)
    inverse = np.linalg.solve(rows.T @ rows, rows.T)
    fit = inverse * np.repeat(np.square(read), len(places)) @ inverse.T
    at = design(model, points)
    given_as = alignment(places, model, {"x": read[0], "y": read[1]}, over=over)
    geometry = GEOMETRY | {"field": {"x": "81 mm", "y": "81 mm"}} if over == "field" else GEOMETRY
    geometry = geometry | {"wafer": {"diameter": "130 mm"}}
    found = placed_covariance(one_reading(given_as, **geometry), points, over=over)
    assert found == pytest.approx(at @ fit @ at.T, rel=1e-6, abs=1e-8 * float(np.abs(fit).max()))


@given(places=places, model=st.sampled_from(list(SIZES)))
def test_no_more_sources_than_parameters_where_x_and_y_are_read_alike(places, model):
    rows = design(model, places)
    assume(np.linalg.cond(rows / np.linalg.norm(rows, axis=0)) < 1e3)
    assert len(scalars(sites_of(places, model), "nm", alike=True)) == SIZES[model]

"""Sites: 3 x 3 in every whole field when a flow has shapes, one point when it has none."""

from itertools import product

import numpy as np
import pytest

from flowplan.engine.points import Point, basis_at, sites_of
from tests.support.flows import bare_flow, flow_of, mask

GEOMETRY = {"wafer": {"diameter": "50 mm"}, "field": {"x": "10 mm", "y": "6 mm"}}


def sites(*, shaped=True, **geometry):
    terms = {"turn": {"random": "1 urad", "shape": "rotation"}} if shaped else {"turn": 1}
    return sites_of(flow_of(bare_flow([mask("A", terms=terms)], [], **geometry)))


def test_without_shapes_one_point_is_enough():
    found = sites(shaped=False, **GEOMETRY)
    assert (found.n_points, found.n_fields) == (1, 1)
    assert found.point(0) == Point(0, 0, 0, 0)
    assert found.basis.T.tolist() == [[1, 0, 0, 0, 0]]


def test_without_a_wafer_one_field_is_sampled():
    found = sites(field=GEOMETRY["field"])
    assert (found.n_points, found.n_fields) == (9, 1)
    corners_middles_centre = set(product((-5.0, 0.0, 5.0), (-3.0, 0.0, 3.0)))
    assert {(p.x, p.y) for p in map(found.point, range(9))} == corners_middles_centre


def test_every_field_has_the_same_nine_sites():
    found = sites(**GEOMETRY)
    assert found.n_points == 9 * found.n_fields
    by_field = found.positions.reshape(found.n_fields, 9, 4)
    assert (by_field[:, :, 2:] == by_field[:1, :, 2:]).all()
    assert (by_field[:, :, :2] == by_field[:, :1, :2]).all()


def test_centres_are_one_a_field():
    found = sites(**GEOMETRY)
    assert found.centres.shape == (found.n_fields, 2)
    assert len({tuple(c) for c in found.centres}) == found.n_fields
    assert [0.0, 0.0] in found.centres.tolist()


def test_all_sites_lie_on_the_usable_wafer_and_reach_its_rim():
    """No site lies outside, and one more field in any direction would."""
    found = sites(**GEOMETRY)
    radius = np.hypot(found.basis[3], found.basis[4])
    assert radius.max() <= 25
    centres = {tuple(c) for c in found.centres}
    for X, Y in centres:
        for step in ((10, 0), (-10, 0), (0, 6), (0, -6)):
            further = (X + step[0], Y + step[1])
            assert further in centres or np.hypot(abs(further[0]) + 5, abs(further[1]) + 3) > 25


def test_points_are_plain_floats():
    point = sites(**GEOMETRY).point(3)
    assert all(type(v) is float for v in (point.X, point.Y, point.x, point.y))


def test_basis_functions_of_position():
    """1, field x, field y, and the place on the wafer: the field's centre plus the site."""
    found = basis_at(np.array([[20.0, -16.0, 7.0, 3.0], [0.0, 0.0, -1.0, 0.5]]))
    assert found.T.tolist() == [[1, 7, 3, 27, -13], [1, -1, 0.5, -1, 0.5]]


def test_sites_hold_the_basis_at_their_positions():
    found = sites(**GEOMETRY)
    assert np.array_equal(found.basis, basis_at(found.positions))


@pytest.mark.parametrize("index", [0, 8])
def test_corner_sites_are_symmetric(index):
    found = sites(field=GEOMETRY["field"])
    assert (abs(found.point(index).x), abs(found.point(index).y)) == (5, 3)

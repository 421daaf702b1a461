"""Where fields lie: a grid with one field on the wafer's centre, whole fields only."""

from itertools import product

import pytest

from flowplan.model.flow import Flow
from flowplan.model.geometry import (
    MOST_FIELDS,
    field_grid,
    field_size,
    too_many_fields,
    usable_radius,
    whole_fields,
)
from tests.support.flows import bare_flow, flow_of, mask


def flow(**more):
    return flow_of(bare_flow([mask("A")], [], **more))


def by_enumeration(radius, width, height):
    """Every field of a large grid whose four corners lie in the circle."""
    reach = int(radius / min(width, height)) + 2
    centres = ((i * width, j * height) for j, i in product(range(-reach, reach + 1), repeat=2))
    half = [(u * width / 2, v * height / 2) for u, v in product((-1, 1), repeat=2)]
    inside = radius * (1 + 1e-12)
    return [(X, Y) for X, Y in centres if all(abs(complex(X + x, Y + y)) <= inside for x, y in half)]


@pytest.mark.parametrize(
    ("radius", "width", "height"),
    [(70, 15, 15), (147, 26, 33), (46, 3, 3), (97, 22, 22), (50, 60, 10), (50, 10, 60), (147, 4.3, 0.9)],
)
def test_grid_holds_the_fields_whose_corners_are_inside(radius, width, height):
    assert list(field_grid(radius, width, height)) == by_enumeration(radius, width, height)


def test_a_field_that_just_touches_the_rim_counts():
    """A 6 x 8 field has its corners at exactly 5; 5 fields of 10 x 10 reach hypot(15, 5) and hypot(5, 15)."""
    assert field_grid(5, 6, 8) == ((0, 0),)
    assert field_grid(5 - 1e-6, 6, 8) == ()
    assert len(field_grid(250**0.5, 10, 10)) == 5


def test_fields_come_row_by_row_from_below():
    assert field_grid(250**0.5, 10, 10) == ((0, -10), (-10, 0), (0, 0), (10, 0), (0, 10))


@pytest.mark.parametrize("size", [(0, 0), (0, 5), (5, 0)])
def test_a_point_field_stands_at_the_centre(size):
    assert field_grid(50, *size) == ((0, 0),)


def test_rows_too_far_out_for_their_width_are_left_out():
    """A field of 2 x 30 fits in height at |Y| = 30 but not with its corners: hypot(1, 45) > 45."""
    assert {y for _, y in field_grid(45, 2, 30)} == {0}


def test_sizes_come_out_in_mm_whatever_the_files_unit():
    one = flow(
        unit="um", wafer={"diameter": 100000, "edge_exclusion": "4 mm"}, field={"x": 3000, "y": "0.2 cm"}
    )
    assert field_size(one) == (3, 2)
    assert usable_radius(one) == 46


def test_without_a_field_its_size_is_nothing():
    assert field_size(flow()) == (0, 0)


def test_without_a_wafer_there_is_one_field_at_the_centre():
    one = flow(field={"x": "10 mm", "y": "10 mm"})
    assert usable_radius(one) is None
    assert whole_fields(one) == ((0, 0),)
    assert not too_many_fields(one)


def test_edge_exclusion_is_nothing_by_default():
    assert usable_radius(flow(wafer={"diameter": "200 mm"})) == 100


def test_an_exclusion_beyond_the_centre_leaves_nothing():
    assert whole_fields(flow(wafer={"diameter": "20 mm", "edge_exclusion": "11 mm"})) == ()


def test_whole_fields_of_a_flow():
    """300 mm, 26 x 33 mm, 3 mm excluded, one field on the centre: 57, by our own count of corners."""
    one = flow(wafer={"diameter": "300 mm", "edge_exclusion": "3 mm"}, field={"x": "26 mm", "y": "33 mm"})
    assert len(whole_fields(one)) == len(by_enumeration(147, 26, 33)) == 57


@pytest.mark.parametrize(("side", "too_many"), [("1.6 mm", False), ("1.2 mm", True)])
def test_more_fields_than_any_wafer_has_mean_a_wrong_unit(side, too_many):
    """pi x 150^2 / side^2 is 27,600 fields of 1.6 mm and 49,100 of 1.2 mm."""
    data = bare_flow([mask("A")], [], wafer={"diameter": "300 mm"}, field={"x": side, "y": side})
    assert too_many_fields(Flow.model_validate(data)) is too_many  # a checked flow would be refused
    assert MOST_FIELDS == 40_000


def test_without_a_field_there_are_not_too_many():
    assert not too_many_fields(flow(wafer={"diameter": "300 mm"}))

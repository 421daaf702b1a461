"""Sources and modes: what one scalar does along each axis, and how equal keys become one source."""

import numpy as np
import pytest

from flowplan.engine.sources import N_BASIS, Source, SourceBook, action, deviation

PLACE = {"x": 2.0, "y": 3.0, "X": 20.0, "Y": 30.0}
#: Basis functions there, in the order that the module states: 1, x, y, X + x, Y + y.
BASIS = (1.0, PLACE["x"], PLACE["y"], PLACE["X"] + PLACE["x"], PLACE["Y"] + PLACE["y"])


def displaced(shape, over, axis):
    found = action(shape, over, axis)
    return 0.0 if found is None else found[1] * BASIS[found[0]]


def test_there_are_five_basis_functions():
    assert len(BASIS) == N_BASIS


@pytest.mark.parametrize("over", ["field", "wafer"])
@pytest.mark.parametrize(
    ("shape", "expected"),
    [
        ("shift", lambda x, y: (1, 1)),
        ("rotation", lambda x, y: (-y, x)),
        ("magnification", lambda x, y: (x, y)),
        ("scale", lambda x, y: (x, y)),
        ("skew", lambda x, y: (-y, 0)),
    ],
)
def test_a_unit_of_each_shape(shape, over, expected):
    place = (2.0, 3.0) if over == "field" else (22.0, 33.0)
    assert (displaced(shape, over, "x"), displaced(shape, over, "y")) == expected(*place)


@pytest.mark.parametrize(
    ("kind", "sigma", "expected"),
    [
        ("random", 3, 1 / 3),
        ("random", 1, 1),
        ("uniform", 3, 3**-0.5),  # half-width / sqrt(3), whatever the flow's sigma
        ("uniform", 1, 3**-0.5),
        ("bound", 3, 0),
        ("offset", 3, 0),
    ],
)
def test_standard_deviation_of_a_size_of_one(kind, sigma, expected):
    assert deviation(kind, sigma) == pytest.approx(expected, abs=0, rel=1e-15)


def source(name="t", size=1.0):
    return Source(name, "A", "random", "shift", size)


class TestSourceBook:
    def test_another_key_is_another_source(self):
        book = SourceBook()
        assert [book.source("a", source(), "L"), book.source("b", source(), "L")] == [0, 1]
        assert len(book.sources) == 2

    def test_an_equal_key_is_the_same_source(self):
        book = SourceBook()
        assert book.source("a", source(), "L") == book.source("a", source(), "L")
        assert book.sources == [source()]

    def test_a_book_kept_apart_tells_places_with_one_key_from_each_other(self):
        book = SourceBook(apart=True)
        assert [book.source("a", source(), place) for place in ("L", "M", "L")] == [0, 1, 0]

    @pytest.mark.parametrize("sizes", [(2.0, 5.0, 3.0), (5.0, 2.0, 3.0), (2.0, -5.0, 3.0)])
    def test_the_largest_size_quoted_for_it_counts(self, sizes):
        book = SourceBook()
        for size in sizes:
            book.source("a", source(size=size), "L")
        assert [abs(s.size) for s in book.sources] == [5.0]

    def test_a_mode_is_a_source_with_a_basis_function_on_one_axis(self):
        book = SourceBook()
        assert book.mode("x", 0, 0) == book.mode("x", 0, 0) == 0
        assert book.mode("x", 0, 1) == 1
        assert book.mode("y", 0, 1) == 0

    def test_tables_sort_modes_by_source_and_say_where_each_went(self):
        book = SourceBook()
        asked = [(2, 0), (0, 3), (2, 4), (0, 1)]
        modes = [book.mode("x", *pair) for pair in asked]
        tables, places = book.tables()
        table = tables["x"]
        assert table.size == 4
        assert list(zip(table.source, table.basis, strict=True)) == [(0, 1), (0, 3), (2, 0), (2, 4)]
        assert (table.starts.tolist(), table.active.tolist()) == ([0, 2], [0, 2])
        for pair, mode in zip(asked, modes, strict=True):
            place = places["x"][mode]
            assert (table.source[place], table.basis[place]) == pair

    def test_an_axis_without_modes_has_an_empty_table(self):
        tables, places = SourceBook().tables()
        for axis in "xy":
            table = tables[axis]
            assert (table.size, table.starts.size, table.active.size, places[axis].size) == (0, 0, 0, 0)
            assert table.source.dtype == np.int64

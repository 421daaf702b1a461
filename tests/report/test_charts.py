"""Geometry of chains, bars and wafer maps."""

import re

import pytest

from flowplan.engine.graph import Chain
from flowplan.report.charts import BAR_STEPS, bar, chain_drawing, runs, squares


def test_two_branches_meet_at_the_top() -> None:
    drawing = chain_drawing(Chain(("P", "Q", "TOP", "R"), "TOP", False), ("1", "2", "3"))
    places = {box.full: (box.x, box.y) for box in drawing.boxes}
    assert places["TOP"][1] < places["Q"][1] < places["P"][1]
    assert places["Q"][0] == places["P"][0] < places["TOP"][0] < places["R"][0]
    assert {box.full: box.kind for box in drawing.boxes} == {
        "TOP": "through",
        "Q": "mid",
        "P": "end",
        "R": "end",
    }
    assert [line.label for line in drawing.lines] == ["1", "2", "3"]
    assert [line.anchor for line in drawing.lines] == ["end", "end", "start"]


def test_one_branch_stands_straight() -> None:
    drawing = chain_drawing(Chain(("A", "B", "C"), "A", False), ("1", "2"))
    assert len({box.x for box in drawing.boxes}) == 1
    assert [line.anchor for line in drawing.lines] == ["start", "start"]


@pytest.mark.parametrize("layers", [("A", "B"), ("A", "T", "B"), ("A", "B", "T", "C", "D", "E")])
def test_boxes_and_labels_lie_inside_the_drawing_and_do_not_overlap(layers: tuple[str, ...]) -> None:
    through = "T" if "T" in layers else layers[0]
    d = chain_drawing(Chain(layers, through, False), ("±123456.7",) * (len(layers) - 1))
    for box in d.boxes:
        assert d.left <= box.x - d.box_width / 2
        assert box.x + d.box_width / 2 <= d.left + d.width
        assert box.y - d.box_height / 2 >= 0
        assert box.y + d.box_height / 2 <= d.height
    for line in d.lines:
        width = 9 * len(line.label)  # widest digits at 14 px
        start = line.label_x - (width if line.anchor == "end" else 0)
        assert d.left <= start
        assert start + width <= d.left + d.width
    corners = [(box.x, box.y) for box in d.boxes]
    for i, (x, y) in enumerate(corners):
        for other_x, other_y in corners[:i]:
            assert abs(x - other_x) >= d.box_width or abs(y - other_y) > d.box_height


def test_arrows_lead_up_from_the_child_to_its_reference() -> None:
    d = chain_drawing(Chain(("A", "T", "B"), "T", False), ("1", "2"))
    places = {box.full: box for box in d.boxes}
    for line, child in zip(d.lines, ("A", "B"), strict=True):
        assert (line.x1, line.y1) == (places[child].x, places[child].y - d.box_height // 2)
        assert line.y2 == places["T"].y + d.box_height // 2
        assert abs(line.x2 - places["T"].x) < d.box_width / 2


def test_long_ids_are_cut_in_the_box_and_whole_beside_it() -> None:
    d = chain_drawing(Chain(("A", "L" * 40), "A", False), ("1",))
    box = next(box for box in d.boxes if box.full == "L" * 40)
    assert box.text == "L" * 16 + "…"


@pytest.mark.parametrize(
    ("share", "steps"),
    [(0.0, 0), (1e-9, 1), (0.5, BAR_STEPS // 2), (1.0, BAR_STEPS), (1.2, 36), (9.0, 39), (float("inf"), 39)],
)
def test_bar_is_cut_a_little_past_the_whole_and_never_lost(share: float, steps: int) -> None:
    assert bar(share) == steps


def cells_of(path: str) -> set[tuple[int, int]]:
    """Return the grid places that a path of runs covers, as a dash pattern of pitch 1 cuts it."""
    found = set()
    for x, y, way, length in re.findall(r"M(-?\d+) ?(-?\d+)([hv])(\d*)\.1", path):
        for i in range(int(length or 0) + 1):
            found.add((int(x) + (i if way == "h" else 0), int(y) + (i if way == "v" else 0)))
    return found


@pytest.mark.parametrize(
    "places",
    [
        [],
        [(0, 0)],
        [(0, 0), (1, 0), (2, 0)],
        [(0, 0), (0, 1), (0, 2), (3, -2), (3, -1)],
        [(x, y) for x in range(-3, 4) for y in range(-3, 4) if x * x + y * y <= 9],
        [(0, 0), (2, 0), (4, 0)],
    ],
)
def test_runs_cover_exactly_the_places(places: list[tuple[int, int]]) -> None:
    assert cells_of(runs(places)) == set(places)


def test_runs_take_the_shorter_direction() -> None:
    assert runs([(0, y) for y in range(9)]) == "M0 0v8.1"
    assert runs([(x, 0) for x in range(9)]) == "M0 0h8.1"


def test_squares_group_places_by_class() -> None:
    grouped = squares([(0, 0), (1, 0), (5, 5)], [2, 2, 0])
    assert [(s.level, cells_of(s.path)) for s in grouped] == [(0, {(5, 5)}), (2, {(0, 0), (1, 0)})]

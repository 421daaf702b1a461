"""SEMI M20-1104, 6.2 and 7.2: the wafer is turned about y, so x reverses on the back.

A point keeps its (x, y) through the wafer. What the exposure does in its own turned-over frame is
seen from the front with x reversed: a shift (dx, dy) becomes (-dx, dy), a rotation and a skew turn
their sense, magnification and scale stay what they are.
"""

import pytest

from tests.support.displacement import displacement
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair

GEOMETRY = {"wafer": {"diameter": "150 mm"}, "field": {"x": "20 mm", "y": "16 mm"}}
POINT = (20.0, -16.0, 7.0, 3.0)


def turned_over(displace, x, y):
    """Expose in the back's own frame, x' = -x, and look at the displacement from the front."""
    dx, dy = displace(-x, y)
    return -dx, dy


IN_ITS_OWN_FRAME = {
    "shift": ({"x": 5, "y": 4}, lambda x, y: (5, 4)),
    "rotation": ("2 urad", lambda x, y: (-2 * y, 2 * x)),
    "magnification": ("2 ppm", lambda x, y: (2 * x, 2 * y)),
    "scale": ({"x": "2 ppm", "y": "3 ppm"}, lambda x, y: (2 * x, 3 * y)),
    "skew": ("2 urad", lambda x, y: (-2 * y, 0)),
}


def exposed(shape, side, over="field"):
    term = {"offset": IN_ITS_OWN_FRAME[shape][0], "shape": shape, "over": over}
    return bare_flow([mask("L", side=side, terms={"t": term})], [], **GEOMETRY)


@pytest.mark.parametrize("over", ["field", "wafer"])
@pytest.mark.parametrize("shape", IN_ITS_OWN_FRAME)
def test_the_back_is_the_front_turned_about_y(shape, over):
    x, y = (7.0, 3.0) if over == "field" else (27.0, -13.0)
    expected = turned_over(IN_ITS_OWN_FRAME[shape][1], x, y)
    assert displacement(exposed(shape, "back", over), "L", [POINT])[0] == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize("shape", IN_ITS_OWN_FRAME)
def test_the_front_is_as_written(shape):
    expected = IN_ITS_OWN_FRAME[shape][1](7.0, 3.0)
    assert displacement(exposed(shape, "front"), "L", [POINT])[0] == pytest.approx(expected, rel=1e-15)


def test_a_point_keeps_its_x_and_y():
    """A back mask without errors of its own lies exactly on what it aligns to, also off centre."""
    turn = {"turn": {"offset": "2 urad", "shape": "rotation", "over": "wafer"}}
    masks = [mask("FRONT", terms=turn), mask("BACK", "FRONT", side="back")]
    result = margins_of(bare_flow(masks, [overlay_pair("FRONT", "BACK")], **GEOMETRY))
    for axis in "xy":
        found = entry(result, "FRONT-BACK", axis)
        assert (found.overlay.offset, found.point, found.sources) == (0.0, None, ())


def test_a_shift_common_to_both_sides_cancels_in_y_and_doubles_in_x():
    """Common practice, no source: this is why a tool's fixed offset shows front to back."""
    tools = {"tool": {"terms": {"offset of the tool": {"offset": {"x": 30, "y": 40}}}}}
    masks = [mask("FRONT"), mask("BACK", side="back")]
    result = margins_of(bare_flow(masks, [overlay_pair("FRONT", "BACK")], tools=tools))
    assert entry(result, "FRONT-BACK", "x").overlay.offset == -60
    assert entry(result, "FRONT-BACK", "y").overlay.offset == 0

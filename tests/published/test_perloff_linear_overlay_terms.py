"""Linear overlay terms over field and wafer, in the manner of D. S. Perloff, IEEE J. Solid-State
Circuits 13(4), 436 (1978); the reference is from memory, and no figure from inside was seen.

All figures are computed by hand: 1 urad or 1 ppm over 1 mm is 1 nm, rotation (-theta y, theta x),
magnification (m x, m y). The 26 mm x 33 mm field is from memory.
"""

import math

import numpy as np
import pytest

from tests.support.displacement import displacement
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure

GEOMETRY = {
    "wafer": {"diameter": "300 mm", "edge_exclusion": "3 mm"},
    "field": {"x": "26 mm", "y": "33 mm"},
}
CORNER = (0.0, 0.0, 13.0, 16.5)


def shaped(shape, size, over="field", kind="offset"):
    term = {kind: size, "shape": shape, "over": over}
    masks = [mask("REF"), mask("L", terms={"t": term})]
    return bare_flow(masks, [overlay_pair("REF", "L")], **GEOMETRY)


@pytest.mark.parametrize(
    ("shape", "size", "expected"),
    [
        ("magnification", "1 ppm", (13, 16.5)),
        ("rotation", "1 urad", (-16.5, 13)),
        ("skew", "1 urad", (-16.5, 0)),
        ("scale", {"x": "1 ppm", "y": "-2 ppm"}, (13, -33)),
    ],
)
def test_the_plus_plus_corner_of_a_field(shape, size, expected):
    ((dx, dy),) = displacement(shaped(shape, size), "L", [CORNER])
    assert (dx, dy) == pytest.approx(expected, rel=1e-15)


def test_length_of_the_corner_vector():
    ((dx, dy),) = displacement(shaped("magnification", "1 ppm"), "L", [CORNER])
    assert Figure("21.00595", math.hypot(13, 16.5), "half diagonal").agrees_with(math.hypot(dx, dy))


@pytest.mark.parametrize(("shape", "size"), [("rotation", "1 urad"), ("magnification", "1 ppm")])
def test_one_microradian_or_ppm_over_one_millimetre_is_one_nanometre(shape, size):
    moved = displacement(shaped(shape, size), "L", [(0, 0, 1, 0), (0, 0, 0, 1)])
    assert np.linalg.norm(moved, axis=1) == pytest.approx(1.0, rel=1e-15)


def test_over_the_wafer_the_site_counts_from_the_wafer_centre():
    ((dx, dy),) = displacement(shaped("rotation", "1 urad", "wafer"), "L", [(26, -33, 13, 16.5)])
    assert (dx, dy) == pytest.approx((16.5, 39), rel=1e-15)


def test_wafer_scale_at_the_edge_of_a_300_mm_wafer():
    ((dx, _),) = displacement(shaped("scale", "0.1 ppm", "wafer"), "L", [(150, 0, 0, 0)])
    assert Figure("15", 15.0, "0.1 ppm times the radius").agrees_with(dx)


@pytest.mark.parametrize(("column", "printed"), [(0, "7.505553"), (1, "9.526279")])
def test_rms_over_a_uniformly_sampled_field(column, printed):
    u = (np.arange(20_000) + 0.5) / 20_000 - 0.5
    line = [(0, 0, 26 * t, 33 * t) for t in u]
    moved = displacement(shaped("magnification", "1 ppm"), "L", line)[:, column]
    figure = Figure(printed, (26, 33)[column] / math.sqrt(12), "width / sqrt(12); midpoints, 1.3e-9 below")
    assert figure.agrees_with(math.sqrt(np.mean(moved**2)))


@pytest.mark.parametrize("over", ["field", "wafer"])
@pytest.mark.parametrize(
    ("shape", "size", "axes"),
    [
        ("magnification", "1 ppm", "xy"),
        ("rotation", "1 urad", "yx"),
        ("skew", "1 urad", "y"),
        ("scale", "1 ppm", "xy"),
    ],
)
def test_the_reported_point_is_the_farthest_that_exposure_reaches(shape, size, axes, over):
    """Largest |x| and |y| among the whole fields: the rows of 26 x 33 fields on 147 mm radius."""
    reach = {"x": 13.0, "y": 16.5}
    if over == "wafer":
        reach = {"x": 5.5 * 26 - 13, "y": 4.5 * 33 - 16.5}
        rows = [k for k in range(-9, 10) if math.hypot(13, (abs(k) + 0.5) * 33) <= 147]
        columns = [k for k in range(-9, 10) if math.hypot((abs(k) + 0.5) * 26, 16.5) <= 147]
        reach = {"x": (max(columns) + 0.5) * 26, "y": (max(rows) + 0.5) * 33}
    result = margins_of(shaped(shape, size, over, kind="random"))
    for axis, lever in zip("xy", axes, strict=False):
        assert entry(result, "REF-L", axis).overlay.random == pytest.approx(reach[lever], rel=1e-14)

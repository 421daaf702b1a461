"""SEMI P18-92 (reapproved 1104): overlay as a vector, total = interfield + intrafield.

P18 3.1.1 writes the lower (substrate) pattern minus the upper (overlaying) one; flowplan writes the
upper minus the lower, so that only the sign of offsets differs. 3.1.2 to 3.1.4 with Note 1 add an
interfield part, taken at the lens centre, and an intrafield part.
"""

import pytest

from tests.support.displacement import displacement
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair

GEOMETRY = {"wafer": {"diameter": "200 mm"}, "field": {"x": "20 mm", "y": "20 mm"}}


def test_the_sign_is_upper_minus_lower():
    masks = [mask("LOWER", terms={"t": {"offset": 10}}), mask("UPPER", terms={"t": {"offset": 25}})]
    found = entry(margins_of(bare_flow(masks, [overlay_pair("LOWER", "UPPER")])), "LOWER-UPPER")
    p18 = 10 - 25
    assert found.overlay.offset == -p18


def test_total_is_interfield_plus_intrafield():
    """A shape over the wafer at a site = the same at the lens centre + the same over the field."""

    def at(over, point):
        terms = {"turn": {"offset": "2 urad", "shape": "rotation", "over": over}}
        return displacement(bare_flow([mask("L", terms=terms)], [], **GEOMETRY), "L", [point])[0]

    total = at("wafer", (40, -20, 10, 5))
    assert total == pytest.approx(at("wafer", (40, -20, 0, 0)) + at("field", (40, -20, 10, 5)), rel=1e-15)


def test_total_alignment_is_taken_where_the_terms_say():
    """Interfield and intrafield terms of two names add as vectors, offsets with their signs."""
    terms = {
        "grid": {"offset": "1 ppm", "shape": "magnification", "over": "wafer"},
        "lens": {"offset": "-3 ppm", "shape": "magnification"},
    }
    data = bare_flow([mask("L", terms=terms)], [], **GEOMETRY)
    moved = displacement(data, "L", [(40, -20, 10, 5)])[0]
    assert moved == pytest.approx((50 - 30, -15 - 15), rel=1e-15)

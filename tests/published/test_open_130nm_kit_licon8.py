"""Open 130 nm process kit, periphery rules: poly around the local contact (licon.8) is 0.050 um.

With the width tolerances of its table, 3 sigma 20 nm for poly and 32 nm for the contact, edges take
10 nm and 16 nm, and a root-sum-square leaves sqrt(50^2 - 10^2 - 16^2) = 46.30 nm for the overlay.
The rule and tolerances were read; the room left is computed here, the kit does not state it.
"""

import math

import pytest

from tests.support.flows import bare_flow, entry, margins_of, mask
from tests.support.published import Figure

ROOM = Figure("46.30", math.sqrt(50**2 - 10**2 - 16**2), "the margin is 0 there")


def margin(overlay):
    masks = [
        mask("POLY", cd=20),
        mask("LICON", [{"mask": "POLY", "alignment": overlay}], cd=32),
    ]
    pair = {"name": "licon.8", "rule": "enclosure", "inner": "LICON", "outer": "POLY", "drawn": "0.050 um"}
    data = bare_flow(masks, [pair], sigma=3, confidence=3, basis="rss")
    return entry(margins_of(data), "licon.8")


def test_margin_changes_sign_within_the_last_digit():
    assert margin(float(ROOM.printed) - ROOM.tolerance).margin.rss > 0
    assert margin(float(ROOM.printed) + ROOM.tolerance).verdict == "fail"


def test_margin_is_zero_at_the_unrounded_figure():
    found = margin(ROOM.computed)
    assert found.margin.rss == pytest.approx(0, abs=1e-10)
    assert found.cpk == pytest.approx(1, rel=1e-12)

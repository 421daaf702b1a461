"""Facts of the trade: common practice, no source.

What a process engineer knows without looking it up; each follows from how the layers are made.
"""

import math

import pytest

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair

STEPPER = {
    "stepper": {
        "alignment": 90,
        "wafer_alignment": "5 um",
        "terms": {"stage": 60, "lens": {"random": 45, "enters": "pattern", "common": 0.8}},
    }
}
GATE_MODULE = [
    mask("WELL", tool="stepper"),
    mask("ACTIVE", "WELL", "stepper", cd=80),
    mask("GATE", "ACTIVE", "stepper", cd={"random": 70, "offset": -20}),
    mask("CONTACT", "ACTIVE", "stepper", cd=80),
]
SOURCE_DRAIN = {"id": "SD", "follows": "GATE", "tone": "opposite", "edge": {"random": 15}}


def gate_module(*pairs, **more):
    data = bare_flow(GATE_MODULE, list(pairs), tools=STEPPER, self_aligned=[SOURCE_DRAIN], **more)
    return margins_of(data | {"sigma": 3, "confidence": 3})


def test_a_self_aligned_gate_has_no_placement_error_against_its_source_and_drain():
    result = gate_module(overlay_pair("GATE", "SD", limit=1))
    for axis in "xy":
        found = entry(result, "GATE-SD", axis)
        assert found.overlay.random == found.overlay.bound == found.overlay.offset == 0.0
        assert found.sources == ()
        assert (found.cpk, found.fail_probability) == (math.inf, 0.0)


def test_the_gate_width_does_not_change_its_overlap_with_a_source_drain_it_masks():
    """The implant's edge moves with the gate's edge; only its own 15 nm per edge remains."""
    pair = {"name": "p", "rule": "overlap", "between": ["GATE", "SD"], "drawn": 90, "keep": 20}
    found = entry(gate_module(pair), "p")
    assert [row.source.of for row in found.sources] == ["SD"]
    assert found.margin.mixed == 90 - 20 - 15


def test_a_spacer_of_the_same_tone_repeats_the_edge_of_its_parent():
    feature = SOURCE_DRAIN | {"id": "SPACER", "tone": "same", "edge": 4}
    pair = {"name": "p", "rule": "enclosure", "outer": "SPACER", "inner": "GATE", "drawn": 20}
    data = bare_flow(GATE_MODULE, [pair], tools=STEPPER, self_aligned=[feature], sigma=3, confidence=3)
    assert entry(margins_of(data), "p").need.mixed == 4


def test_a_contact_sees_the_source_drain_where_it_sees_the_gate():
    result = gate_module(overlay_pair("GATE", "CONTACT"), overlay_pair("SD", "CONTACT"))
    to_gate, to_source = entry(result, "GATE-CONTACT"), entry(result, "SD-CONTACT")
    assert to_source.overlay == to_gate.overlay
    assert to_source.chain.layers == ("SD", *to_gate.chain.layers)


def test_two_siblings_on_one_mark_do_not_see_that_mask_s_error():
    """Neither its placement nor an asymmetry of its marks: both read the same wrong place."""

    def apart(**of_the_parent):
        masks = [mask("PARENT", **of_the_parent), mask("B", "PARENT"), mask("C", "PARENT")]
        data = bare_flow(masks, [overlay_pair("B", "C"), overlay_pair("PARENT", "B")])
        return margins_of(data | {"tools": {"tool": {"alignment": 30}}})

    terms = {
        "mask writing": {"random": 25, "bound": 10, "offset": 7},
        "mark asymmetry": {"bound": 20, "offset": 5, "enters": "marks"},
    }
    plain, loaded = apart(), apart(terms=terms)
    assert entry(loaded, "B-C").overlay == entry(plain, "B-C").overlay
    assert entry(loaded, "PARENT-B").overlay.bound == 20
    assert entry(loaded, "B-C").overlay.random == pytest.approx(30 * math.sqrt(2), rel=1e-15)


def test_the_coarse_alignment_to_the_wafer_matters_to_no_pair():
    result = gate_module(*(overlay_pair(a, b) for a, b in (("WELL", "GATE"), ("GATE", "CONTACT"))))
    assert all(row.source.name != "alignment to wafer" for e in result.entries for row in e.sources)


def test_two_masks_without_a_common_mark_see_it_twice():
    masks = [mask("A", tool="stepper"), mask("B", tool="stepper")]
    tools = {"stepper": {"wafer_alignment": "5 um"}}
    found = entry(margins_of(bare_flow(masks, [overlay_pair("A", "B")], tools=tools)), "A-B")
    assert found.overlay.random == pytest.approx(5000 * math.sqrt(2), rel=1e-15)
    assert found.chain.through == "wafer"


def test_aligning_directly_beats_the_detour():
    """Gate and contact both on active: aligning the contact to the gate itself costs one reading."""
    detour = entry(gate_module(overlay_pair("GATE", "CONTACT")), "GATE-CONTACT")
    direct_masks = [*GATE_MODULE[:3], mask("CONTACT", "GATE", "stepper", cd=80)]
    data = bare_flow(direct_masks, [overlay_pair("GATE", "CONTACT")], tools=STEPPER, sigma=3, confidence=3)
    direct = entry(margins_of(data), "GATE-CONTACT")
    assert direct.overlay.random < detour.overlay.random
    assert detour.chain.layers == ("GATE", "ACTIVE", "CONTACT")
    assert direct.chain.layers == ("GATE", "CONTACT")


def test_hand_calculation_counts_the_common_part_of_the_lens_twice():
    """Two hops, each lens difference 45 sqrt(0.4), against one difference in truth."""
    found = entry(gate_module(overlay_pair("GATE", "CONTACT")), "GATE-CONTACT")
    own_lens = 45**2 * 0.2
    exact = math.sqrt(2 * (90**2 + 60**2 + own_lens))
    by_hand = math.sqrt(2 * (90**2 + 60**2 + 2 * own_lens))
    assert found.overlay.random == pytest.approx(exact, rel=1e-12)
    assert found.chain_rss == pytest.approx(by_hand, rel=1e-12)

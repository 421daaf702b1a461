"""Explanations of a chain, with figures worked by hand.

Everything is quoted and judged at one sigma. A stands on the wafer's alignment of 1000; its marks
carry an error of 12. B reads A with 3, C reads A with 4, D reads B with 6.
"""

import math

import pytest

from flowplan.engine.analysis import Engine
from flowplan.engine.explain import direct, explain
from flowplan.errors import UsageError
from tests.support.flows import bare_flow, flow_of, mask, overlay_pair

MASKS = [
    mask("A", [{"mask": "wafer", "alignment": 1000}], terms={"marks": {"random": 12, "enters": "marks"}}),
    mask("B", [{"mask": "A", "alignment": 3}], terms={"device": {"random": 5, "enters": "pattern"}}),
    mask("C", [{"mask": "A", "alignment": 4}]),
    mask("D", [{"mask": "B", "alignment": 6}]),
]


def engine_of(masks=MASKS, pairs=(), **more):
    return Engine.of(flow_of(bare_flow(list(masks), list(pairs), **more)))


def shared(explanation, name):
    (found,) = [row for row in explanation.shared if row.source.name == name]
    return found


def test_each_hop_has_its_own_overlay():
    hops = explain(engine_of(), "B", "C", "x").hops
    assert [(h.child, h.reference, h.follows, h.weight) for h in hops] == [
        ("B", "A", False, 1.0),
        ("C", "A", False, 1.0),
    ]
    # B on A: alignment 3, A's marks 12, B's device 5; C on A: alignment 4 and A's marks 12
    assert hops[0].overlay.random == pytest.approx(math.sqrt(9 + 144 + 25))
    assert hops[1].overlay.random == pytest.approx(math.sqrt(16 + 144))


def test_what_enters_at_a_hop_comes_largest_first_with_shares_that_add_up():
    hop = explain(engine_of(), "B", "C", "x").hops[0]
    assert [(row.source.name, abs(row.contribution)) for row in hop.sources] == [
        ("marks", 12), ("device", 5), ("alignment to A", 3),
    ]  # fmt: skip
    assert sum(row.share for row in hop.sources) == pytest.approx(1)


def test_siblings_do_not_see_the_mark_error_that_both_read():
    explanation = explain(engine_of(), "B", "C", "x")
    marks = shared(explanation, "marks")
    assert (marks.effect, marks.in_first, marks.in_second, marks.in_overlay) == ("cancels", 12, 12, 0)
    assert marks.apart == pytest.approx(12 * math.sqrt(2))
    assert marks.in_hops
    # left: both alignments and B's device
    assert explanation.entry.overlay.random == pytest.approx(math.sqrt(9 + 16 + 25))
    assert explanation.entry.chain_rss == pytest.approx(math.sqrt(9 + 144 + 25 + 16 + 144))
    assert explanation.excess == pytest.approx(math.sqrt(338 / 50) - 1)


def test_what_both_inherit_from_further_up_cancels_outside_the_hops():
    wafer = shared(explain(engine_of(), "B", "C", "x"), "alignment to wafer")
    assert (wafer.effect, wafer.in_hops, wafer.in_first, wafer.in_second) == ("cancels", False, 1000, 1000)


def test_a_pattern_error_in_the_middle_of_a_chain_cancels_between_its_two_hops():
    # D reads B's marks, not its device pattern: the 5 enters both hops and neither end
    explanation = explain(engine_of(), "A", "D", "x")
    device = shared(explanation, "device")
    assert (device.in_first, device.in_second, device.in_overlay) == (0, 0, 0)
    assert device.apart == pytest.approx(5 * math.sqrt(2))
    assert explanation.entry.overlay.random == pytest.approx(math.sqrt(144 + 9 + 36))


def test_an_error_that_repeats_along_a_chain_grows_and_plain_rss_is_too_small():
    tools = {"tool": {"terms": {"stage": {"random": 5, "common": 1}}}}
    masks = [mask("A"), mask("B", "A"), mask("C", "B")]
    explanation = explain(engine_of(masks, tools=tools), "A", "C", "x")
    # D_C - D_A = 5 + 5 of one and the same source; by hand sqrt(25 + 25)
    stage = shared(explanation, "stage")
    assert (stage.effect, stage.in_overlay) == ("grows", 10)
    assert stage.apart == pytest.approx(math.sqrt(50))
    assert explanation.entry.overlay.random == 10
    assert explanation.excess == pytest.approx(1 / math.sqrt(2) - 1)


def test_an_average_shrinks_what_its_references_carry():
    masks = [
        mask("A", terms={"own": 8}),
        mask("B", [{"mask": "wafer", "alignment": 0}]),
        mask("C", [{"mask": "A", "weight": 0.25}, {"mask": "B", "weight": 0.75}]),
    ]
    explanation = explain(engine_of(masks), "A", "C", "x")
    own = shared(explanation, "own")
    assert (own.effect, own.in_first, own.in_second, own.in_overlay) == ("shrinks", 8, 2, -6)
    assert own.apart == pytest.approx(math.hypot(8, 2))
    assert explanation.entry.chain_rss is None
    assert explanation.excess is None
    assert explanation.hops[0].weight == 0.25


def test_a_bound_that_both_read_counts_twice_by_hand_and_not_at_all_exactly():
    masks = [
        mask("A", terms={"shift": {"bound": 7, "enters": "marks"}}),
        mask("B", [{"mask": "A", "alignment": 3}]),
        mask("C", [{"mask": "A", "alignment": 4}]),
    ]
    row = shared(explain(engine_of(masks), "B", "C", "x"), "shift")
    assert (row.effect, row.apart, row.in_overlay) == ("cancels", 14, 0)


def test_an_offset_that_both_inherit_is_listed_as_gone():
    """Known and signed, so no hop adds it wrongly; it stands in both placements and in no overlay."""
    masks = [
        mask("A", terms={"stress": {"offset": -7}}),
        mask("B", [{"mask": "A", "alignment": 3}]),
        mask("C", [{"mask": "A", "alignment": 4}]),
    ]
    row = shared(explain(engine_of(masks), "B", "C", "x"), "stress")
    assert (row.effect, row.in_first, row.in_second, row.in_overlay) == ("cancels", -7, -7, 0)
    assert row.apart == 14


def test_a_self_aligned_feature_follows_with_no_overlay_at_all():
    engine = engine_of(self_aligned=[{"id": "S", "follows": "B"}])
    explanation = explain(engine, "B", "S", "x")
    (hop,) = explanation.hops
    assert (hop.child, hop.reference, hop.follows, hop.sources) == ("S", "B", True, ())
    assert explanation.entry.overlay.random == 0
    assert explanation.excess is None


def test_hops_are_taken_at_the_worst_point_of_the_pair():
    # 2 urad over a field of 10 mm: 10 nm at the corner for each mask of the chain
    masks = [
        mask("A"),
        mask("B", "A", terms={"turn": {"random": "2 urad", "shape": "rotation"}}),
        mask("C", "B", terms={"turn": {"random": "2 urad", "shape": "rotation"}}),
    ]
    engine = engine_of(masks, field={"x": "10 mm", "y": "10 mm"})
    explanation = explain(engine, "A", "C", "x")
    assert abs(explanation.entry.point.y) == 5
    assert [h.overlay.random for h in explanation.hops] == pytest.approx([10, 10])
    assert explanation.entry.chain_rss == pytest.approx(math.sqrt(200))


def test_reading_directly_shortens_the_chain_and_changes_the_pairs_between_the_two():
    pairs = [overlay_pair("A", "D", limit=20), overlay_pair("B", "C", limit=20)]
    other = direct(engine_of(pairs=pairs), "D", "A", "x")
    assert (other.later, other.earlier, other.refusal) == ("D", "A", "")
    # now sqrt(12^2 + 3^2 + 6^2); then A's marks alone, since the tool itself has no alignment error
    assert other.overlay.before.overlay.random == pytest.approx(math.sqrt(189))
    assert other.overlay.after.overlay.random == pytest.approx(12)
    (change,) = other.pairs
    assert change.before.margin.mixed == pytest.approx(20 - math.sqrt(189))
    assert change.after.margin.mixed == pytest.approx(8)


def test_reading_directly_counts_the_verdicts_of_the_whole_flow():
    pairs = [overlay_pair("A", "D", limit=13, axes="x"), overlay_pair("B", "D", limit=9, axes="x")]
    before, after = direct(engine_of(pairs=pairs), "A", "D", "x").counts
    # A-D: 13 - 13.7 fails, then 13 - 12 passes; B-D: 9 - hypot(6, 5) passes, then
    # 9 - hypot(3, 5) passes as well: A's marks are in both
    assert (before["pass"], before["fail"]) == (1, 1)
    assert (after["pass"], after["fail"]) == (2, 0)


def test_the_other_axis_keeps_its_reference():
    pairs = [overlay_pair("A", "D")]
    engine = engine_of(pairs=pairs)
    (change,) = direct(engine, "A", "D", "x").pairs
    assert change.before.axis == "x"
    assert explain(engine, "A", "D", "y").entry.overlay.random == pytest.approx(math.sqrt(189))


def test_an_average_that_reads_directly_keeps_the_alignment_it_had_for_that_reading():
    masks = [
        mask("A"),
        mask("B", "A"),
        mask("C", [{"mask": "A", "alignment": 7}, {"mask": "B", "alignment": 9}]),
    ]
    other = direct(engine_of(masks), "A", "C", "x")
    assert other.overlay.after.overlay.random == pytest.approx(7)


def test_direct_reading_is_refused_where_it_cannot_be_or_already_is():
    engine = engine_of(self_aligned=[{"id": "S", "follows": "B"}])
    assert direct(engine, "A", "S", "x").refusal == (
        "S is self-aligned: it follows B and has no exposure to align"
    )
    refused = direct(engine, "C", "A", "x")
    assert refused.refusal == "C already aligns directly to A"
    assert (refused.overlay, refused.pairs) == (None, ())


def test_a_layer_against_itself_is_no_question():
    with pytest.raises(UsageError, match="FP602"):
        explain(engine_of(), "A", "A", "x")

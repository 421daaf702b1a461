"""Where layers lie: which source reaches which layer, by hand, on flows as small as can be."""

import numpy as np
import pytest

from flowplan.engine.placement import place
from tests.support.flows import bare_flow, flow_of, mask


def placed(masks, **more):
    return place(flow_of(bare_flow(masks, [], **more)))


def reach(placement, layer, axis="x", part="pattern"):
    """Return what reaches a layer: {(source name, of, kind): amount}."""
    amounts = getattr(placement, part)[axis][placement.index[layer]]
    table = placement.modes[axis]
    return {
        (s.name, s.of, s.kind): float(a)
        for a, s in ((a, placement.sources[i]) for a, i in zip(amounts, table.source, strict=True))
        if a
    }


def test_the_wafer_lies_still():
    found = placed([mask("A", [{"mask": "wafer", "alignment": 5}])])
    assert reach(found, "wafer") == {}
    assert reach(found, "A") == {("alignment to wafer", "A", "random"): 5}


@pytest.mark.parametrize(
    ("enters", "own_pattern", "seen_by_a_reader"), [("layer", 1, 1), ("pattern", 1, 0), ("marks", 0, 1)]
)
def test_where_a_term_enters(enters, own_pattern, seen_by_a_reader):
    found = placed([mask("A", terms={"t": {"random": 1, "enters": enters}}), mask("B", "A")])
    key = ("t", "A", "random")
    assert reach(found, "A").get(key, 0) == own_pattern
    assert reach(found, "B").get(key, 0) == seen_by_a_reader


def test_reading_marks_costs_the_tool_s_alignment_and_the_mask_s_own_mark_reading():
    masks = [mask("A", mark_reading=7), mask("B", "A"), mask("C", "A")]
    found = placed(masks, tools={"tool": {"alignment": 3}})
    assert reach(found, "B") == {
        ("alignment to A", "B", "random"): 3,
        ("mark reading of A", "B", "random"): 7,
    }
    assert reach(found, "C") == {
        ("alignment to A", "C", "random"): 3,
        ("mark reading of A", "C", "random"): 7,
    }
    assert len(found.sources) == 2 * 2 * 2  # fresh for each reader and axis


def test_an_alignment_of_its_own_replaces_the_tool_s():
    found = placed([mask("A"), mask("B", [{"mask": "A", "alignment": 9}])], tools={"tool": {"alignment": 3}})
    assert reach(found, "B") == {("alignment to A", "B", "random"): 9}


def test_weights_divide_what_is_inherited_and_what_is_read():
    both = [{"mask": "A", "weight": 0.25, "alignment": 8}, {"mask": "B", "weight": 0.75}]
    found = placed([mask("A", terms={"t": 4}), mask("B", terms={"t": 4}), mask("C", both)])
    assert reach(found, "C") == {
        ("t", "A", "random"): 1,
        ("t", "B", "random"): 3,
        ("alignment to A", "C", "random"): 2,
    }


def test_a_share_is_common_to_the_masks_on_one_tool():
    terms = {"lens": {"random": 10, "bound": 10, "offset": 10, "common": 0.64}}
    found = placed([mask("A")], tools={"tool": {"terms": terms}})
    assert reach(found, "A") == pytest.approx(
        {
            ("lens", "tool", "random"): 8,
            ("lens", "A", "random"): 6,
            ("lens", "tool", "bound"): 6.4,
            ("lens", "A", "bound"): 3.6,
            ("lens", "tool", "offset"): 10,
        }
    )


def test_a_source_is_one_scalar_of_any_size():
    masks = [
        mask("A", terms={"t": {"random": 2, "source": "chuck"}}),
        mask("B", terms={"u": {"random": 5, "source": "chuck"}}),
    ]
    found = placed(masks)
    assert reach(found, "A") == {("chuck", "shared source", "random"): 2}
    assert reach(found, "B") == {("chuck", "shared source", "random"): 5}
    assert {s.size for s in found.sources} == {5}  # the largest that is quoted


def test_a_mask_s_term_and_its_tool_s_of_one_name_are_two():
    found = placed([mask("A", terms={"stage": 3})], tools={"tool": {"terms": {"stage": 4}}})
    row = found.pattern["x"][found.index["A"]]
    assert sorted(row) == [3, 4]


def test_an_error_of_size_zero_is_no_source():
    found = placed([mask("A", cd=0, terms={"t": {"random": {"x": 0, "y": 2}}})])
    assert reach(found, "A", "x") == {}
    assert reach(found, "A", "y") == {("t", "A", "random"): 2}


def test_edges():
    feature = {"id": "S", "follows": "A", "tone": {"x": "opposite", "y": "same"}, "edge": 1}
    found = placed([mask("A", cd=6), mask("B", edge=6), mask("C")], self_aligned=[feature])
    assert reach(found, "A", part="edge") == {("CD", "A", "random"): 3}
    assert reach(found, "B", part="edge") == {("edge", "B", "random"): 6}
    assert reach(found, "C", part="edge") == {}
    assert reach(found, "S", "x", "edge") == {("CD", "A", "random"): -3, ("edge", "S", "random"): 1}
    assert reach(found, "S", "y", "edge") == {("CD", "A", "random"): 3, ("edge", "S", "random"): 1}


def test_reading_a_self_aligned_feature_reads_its_parent_s_marks():
    terms = {"p": {"random": 2, "enters": "pattern"}, "m": {"random": 5, "enters": "marks"}}
    features = [{"id": "S", "follows": "A"}]
    found = placed([mask("A", terms=terms), mask("B", "S")], self_aligned=features)
    assert reach(found, "S") == {("p", "A", "random"): 2}
    assert reach(found, "B") == {("m", "A", "random"): 5}


def test_overlay_of_weights_that_do_not_add_up_in_binary_is_exactly_zero():
    """Three times a third of 0.1 is not 0.1; what is left is dust, not an error."""
    terms = {"t": {"random": 0.1, "source": "chuck"}}
    masks = [mask(n, terms=terms) for n in "ABC"]
    found = placed([*masks, mask("D", ["A", "B", "C"])])
    index = found.index
    assert not found.overlay("x", [index["A"]], [index["D"]]).any()


def test_telling_modes_are_those_that_differ_or_move_an_edge():
    masks = [mask("A", terms={"t": 1}), mask("B", "A", terms={"t": 2}), mask("C", "A", cd=4)]
    found = placed(masks)
    index = found.index
    names = [
        found.sources[i]
        for i in found.modes["x"].source[found.telling("x", np.array([index["A"], index["B"]]))]
    ]
    assert [(s.name, s.of) for s in names] == [("t", "B")]
    names = [
        found.sources[i]
        for i in found.modes["x"].source[found.telling("x", np.array([index["A"], index["C"]]))]
    ]
    assert [(s.name, s.of) for s in names] == [("CD", "C")]

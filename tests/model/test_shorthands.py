"""What the short forms of a flow file stand for, and what counts when nothing is said."""

import pytest

from flowplan.model.base import AXES
from flowplan.model.flow import Flow
from flowplan.units import Quantity
from tests.support.flows import bare_flow, flow_of, mask, overlay_pair

NM = Quantity


def flow(**more) -> Flow:
    return flow_of(bare_flow([mask("A"), mask("B", "A")], [overlay_pair("A", "B")], **more))


def of_mask(**more):
    return flow_of(bare_flow([mask("A"), mask("B", "A", **more)], [])).masks[1]


def test_what_counts_when_nothing_is_said():
    plain = Flow.model_validate({"flow": "Estuary", "masks": []})
    assert (plain.unit, plain.sigma, plain.confidence, plain.basis, plain.reserve) == ("nm", 3, 3, "mixed", 0)
    assert (plain.revision, plain.wafer, plain.field, plain.tools, plain.pairs) == ("", None, None, {}, ())
    term = of_mask(terms={"t": 3}).terms["t"]
    assert (term.enters, term.shape, term.over, term.source, term.common_share) == (
        "layer", "shift", "field", None, 0,
    )  # fmt: skip
    assert of_mask().side == "front"


@pytest.mark.parametrize(
    ("written", "x", "y"),
    [
        (120, NM(120), NM(120)),
        ("0.12 um", NM(0.12, "um"), NM(0.12, "um")),
        ("0.12µm", NM(0.12, "um"), NM(0.12, "um")),
        ({"x": 30, "y": "40 nm"}, NM(30), NM(40, "nm")),
    ],
)
def test_a_length_serves_both_axes_or_one_each(written, x, y):
    drawn = flow_of(
        bare_flow([mask("A"), mask("B", "A")], [{"rule": "spacing", "between": ["A", "B"], "drawn": written}])
    ).pairs[0].drawn  # fmt: skip
    assert (drawn.on("x"), drawn.on("y")) == (x, y)


@pytest.mark.parametrize(
    ("written", "parts"),
    [
        (3, [("random", 3, 3)]),
        ({"x": 3, "y": 4}, [("random", 3, 4)]),
        ({"bound": 3, "random": {"x": 1, "y": 2}}, [("random", 1, 2), ("bound", 3, 3)]),
        ({"offset": -5, "uniform": 2}, [("uniform", 2, 2), ("offset", -5, -5)]),
    ],
)
def test_a_bare_size_is_random(written, parts):
    found = [(kind, size.x.value, size.y.value) for kind, size in of_mask(cd=written).cd.parts()]
    assert found == parts


@pytest.mark.parametrize(("written", "share"), [(0.1, 0.1), ("10 %", 0.1), ("10%", 0.1), (0, 0), (1, 1)])
def test_a_share_is_a_number_or_a_percentage(written, share):
    assert flow(reserve=written).reserve == pytest.approx(share)


def test_a_named_source_is_common_unless_said_otherwise():
    terms = of_mask(
        terms={
            "all": {"random": 3, "source": "etch"},
            "half": {"random": 3, "source": "etch", "common": "50 %"},
        }
    ).terms
    assert (terms["all"].common_share, terms["half"].common_share) == (1, 0.5)


@pytest.mark.parametrize(
    ("written", "x", "y"),
    [
        ("A", [("A", 1)], [("A", 1)]),
        ({"mask": "A", "alignment": 3}, [("A", 1)], [("A", 1)]),
        (["A", "wafer"], [("A", 0.5), ("wafer", 0.5)], [("A", 0.5), ("wafer", 0.5)]),
        ({"x": "A", "y": ["A", "wafer"]}, [("A", 1)], [("A", 0.5), ("wafer", 0.5)]),
        (
            [{"mask": "A", "weight": 0.25}, {"mask": "wafer", "weight": 0.75}],
            [("A", 0.25), ("wafer", 0.75)],
            [("A", 0.25), ("wafer", 0.75)],
        ),
    ],
)
def test_references_are_one_or_an_average_on_both_axes_or_each(written, x, y):
    references = flow_of(bare_flow([mask("A"), mask("B", written)], [])).masks[1].aligns_to
    found = [[(r.mask, weight) for r, weight in references.weighted(axis)] for axis in AXES]
    assert found == [x, y]


def test_weights_within_rounding_of_1_are_taken_as_1():
    thirds = [{"mask": name, "weight": 0.3333333} for name in ("A", "B", "wafer")]
    references = flow_of(bare_flow([mask("A"), mask("B"), mask("C", thirds)], [])).masks[2].aligns_to
    assert sum(weight for _, weight in references.weighted("x")) == 1


@pytest.mark.parametrize(
    ("tone", "signs"),
    [("same", (1, 1)), ("opposite", (-1, -1)), ({"x": "opposite"}, (-1, 1)), ({"y": "opposite"}, (1, -1))],
)
def test_a_tone_serves_both_axes_or_one(tone, signs):
    feature = flow(self_aligned=[{"id": "S", "follows": "A", "tone": tone}]).self_aligned[0]
    assert (feature.tone.sign("x"), feature.tone.sign("y")) == signs


def test_a_feature_may_follow_one_layer_on_each_axis():
    follows = flow(self_aligned=[{"id": "S", "follows": {"x": "A", "y": "B"}}]).self_aligned[0].follows
    assert (follows.on("x"), follows.on("y")) == ("A", "B")


def test_layers_come_after_what_they_rely_on():
    features = [{"id": "T", "follows": "S"}, {"id": "S", "follows": "B"}]
    masks = [mask("A"), mask("B", "A"), mask("C", "T")]
    assert list(flow_of(bare_flow(masks, [], self_aligned=features)).layers) == ["A", "B", "S", "T", "C"]


@pytest.mark.parametrize(
    ("rule", "name", "layers"),
    [
        ({"rule": "enclosure", "inner": "A", "outer": "B", "drawn": 1}, "A inside B", ("B", "A")),
        ({"rule": "extension", "of": "A", "past": "B", "drawn": 1}, "A past B", ("A", "B")),
        ({"rule": "spacing", "between": ["A", "B"], "drawn": 1}, "A clear of B", ("A", "B")),
        ({"rule": "overlap", "between": ["A", "B"], "drawn": 1}, "A over B", ("A", "B")),
        ({"rule": "overlay", "between": ["A", "B"]}, "B on A", ("A", "B")),
    ],
)
def test_a_pair_without_a_name_is_named_by_its_layers(rule, name, layers):
    (pair,) = flow_of(bare_flow([mask("A"), mask("B", "A")], [rule])).pairs
    assert (pair.name, pair.layers) == (name, layers)
    assert pair.judged_axes == ("x", "y")


def test_a_copy_of_a_flow_sees_its_own_masks():
    first = flow()
    assert list(first.layers) == ["A", "B"]
    second = first.model_copy(update={"masks": first.masks[:1]})
    assert list(second.layers) == ["A"]
    assert second.shapes == frozenset()


def test_a_split_layer_stands_for_its_masks():
    split = flow(split_layers={"M": ["A", "B"]})
    assert (split.expand("M"), split.expand("A")) == (("A", "B"), ("A",))

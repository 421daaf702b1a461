"""Dotted places of quoted sizes."""

import pytest

from flowplan.model.edits import with_size
from flowplan.model.paths import quoted_at, quoted_sizes
from flowplan.units import Quantity
from tests.support.flows import bare_flow, flow_of, mask, overlay_pair


def flow(**tool):
    masks = [
        mask("A", cd={"random": 8, "offset": 2}, mark_reading={"x": 3, "y": 3}),
        mask("B", {"x": [{"mask": "A", "alignment": 5}], "y": "A"}, edge={"bound": 4}),
        mask("C", {"mask": "A", "alignment": {"x": 6, "y": 7}}, terms={"a.b": {"uniform": 9}}),
    ]
    more = {"tools": {"tool": {"alignment": 30} | tool}}
    feature = {"self_aligned": [{"id": "SA", "follows": "A", "edge": 1}]}
    return flow_of(bare_flow(masks, [overlay_pair("A", "B", limit=90)], **more, **feature))


def test_every_size_has_a_place_in_the_order_of_the_file():
    assert [(q.path, q.axis, q.size.value) for q in quoted_sizes(flow())] == [
        ("tools.tool.alignment", None, 30),
        ("masks.A.cd", None, 8),
        ("masks.A.mark_reading", None, 3),
        ("masks.B.aligns_to.x.A.alignment", "x", 5),
        ("masks.B.edge.bound", None, 4),
        ("masks.C.aligns_to.A.alignment", "x", 6),
        ("masks.C.aligns_to.A.alignment", "y", 7),
        ('masks.C.terms."a.b".uniform', None, 9),
        ("self_aligned.SA.edge", None, 1),
    ]


def test_size_is_found_by_its_place_and_changed_there():
    place = quoted_at(flow(), "masks.C.aligns_to.A.alignment", "y")
    changed = with_size(flow(), place, Quantity(12.0))
    values = {(q.path, q.axis): q.size.value for q in quoted_sizes(changed)}
    assert values["masks.C.aligns_to.A.alignment", "y"] == 12
    assert values["masks.C.aligns_to.A.alignment", "x"] == 6


def test_term_of_a_tool_names_its_kind():
    paths = [q.path for q in quoted_sizes(flow(terms={"stage": 5, "lens": {"random": 4, "bound": 2}}))]
    assert paths[1:4] == [
        "tools.tool.terms.stage.random", "tools.tool.terms.lens.random", "tools.tool.terms.lens.bound",
    ]  # fmt: skip


def test_unknown_place_is_refused():
    with pytest.raises(KeyError, match=r"masks\.B\.cd"):
        quoted_at(flow(), "masks.B.cd")


def test_negative_size_is_refused():
    with pytest.raises(ValueError, match=r"tools\.tool\.alignment"):
        with_size(flow(), quoted_at(flow(), "tools.tool.alignment"), Quantity(-1.0))

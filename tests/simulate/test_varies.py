"""How often an error is redrawn: defaults, what the file says, and what does not change."""

import pytest

from flowplan.engine.placement import place
from flowplan.model.build import build
from flowplan.model.check import check
from tests.support.flows import bare_flow, flow_of, margins_of, mask, overlay_pair

GEOMETRY = {"wafer": {"diameter": "100 mm"}, "field": {"x": "10 mm", "y": "10 mm"}}


def levels(tool, **second):
    """Return the level of each source of the second mask and its tool, by name and kind."""
    masks = [mask("A", mark_reading=3.0), mask("B", "A", **second)]
    flow = flow_of(bare_flow(masks, [overlay_pair("A", "B")], **GEOMETRY) | {"tools": {"tool": tool}})
    return {(s.name, s.kind, s.of): s.varies for s in place(flow).sources}


def test_alignment_and_mark_reading_vary_by_wafer():
    found = levels({"alignment": 5.0, "wafer_alignment": 9.0})
    assert {name: level for (name, _, _), level in found.items()} == {
        "alignment to wafer": "wafer",
        "alignment to A": "wafer",
        "mark reading of A": "wafer",
    }


def test_terms_vary_by_what_they_are():
    tool = {
        "terms": {
            "stage": 1.0,
            "lens": {"random": 1.0, "enters": "pattern", "common": 0.5},
            "wafer scale": {"random": "1 ppm", "shape": "scale", "over": "wafer"},
            "field scale": {"random": "1 ppm", "shape": "scale"},
        }
    }
    own = {"writing": {"random": 1.0, "enters": "pattern"}, "marks": {"random": 1.0, "enters": "marks"}}
    found = levels(tool, terms=own, cd=2.0)
    assert {name: level for (name, _, of), level in found.items() if of == "B"} == {
        "stage": "field",
        "lens": "field",
        "wafer scale": "wafer",
        "field scale": "field",
        "writing": "mask",  # the mask's share repeats in every field (SEMI P18)
        "marks": "field",
        "CD": "field",
        "mark reading of A": "wafer",
    }
    assert found["lens", "random", "tool"] == "lot"


def test_a_bound_is_the_same_on_every_wafer():
    found = levels(
        {"alignment": {"random": 1.0, "bound": 2.0}}, cd={"bound": 1.0}, terms={"t": {"bound": 1.0}}
    )
    assert {level for (_, kind, _), level in found.items() if kind == "bound"} == {"mask"}


@pytest.mark.parametrize("level", ["mask", "lot", "wafer", "field"])
def test_the_file_may_say_otherwise(level):
    size = {"random": 1.0, "varies": level}
    found = levels(
        {"alignment": size, "terms": {"lens": size | {"common": 0.5}}},
        cd=size,
        terms={"writing": size | {"enters": "pattern"}},
    )
    assert {v for (name, _, _), v in found.items() if name != "mark reading of A"} == {level}


def test_one_error_in_two_places_is_redrawn_as_rarely_as_the_rarer():
    tool = {"terms": {"t": {"random": 1.0, "source": "drift"}}}
    found = levels(tool, terms={"u": {"random": 1.0, "source": "drift", "enters": "pattern"}})
    assert found["drift", "random", "shared source"] == "mask"


def test_one_error_redrawn_in_two_ways_is_refused():
    terms = [{"t": {"random": 1.0, "source": "s", "varies": v}} for v in ("lot", "wafer")]
    masks = [mask("A", terms=terms[0]), mask("B", "A", terms=terms[1])]
    flow, _ = build(bare_flow(masks, [overlay_pair("A", "B")]))
    (finding,) = [d for d in check(flow) if d.code == "FP307"]
    assert finding.message == "source 's' varies: lot elsewhere, wafer here"
    assert finding.path == ("masks", 1, "terms", "t", "source")


def test_an_unknown_level_names_the_choices():
    flow, findings = build(bare_flow([mask("A", terms={"t": {"random": 1.0, "varies": "day"}})], []))
    (finding,) = findings
    assert flow is None
    assert finding.code == "FP204"
    assert finding.path[-1] == "varies"
    assert "wafer" in finding.message + finding.hint


def test_how_often_alone_is_no_size():
    _, findings = build(bare_flow([mask("A", cd={"varies": "lot"})], []))
    assert [d.code for d in findings] == ["FP202"]


def test_no_margin_depends_on_it():
    def margin(level):
        term = {"random": 4.0, "uniform": 2.0, "varies": level}
        masks = [mask("A"), mask("B", "A", terms={"t": term}, cd={"random": 3.0, "varies": level})]
        pair = {"name": "p", "rule": "enclosure", "inner": "A", "outer": "B", "drawn": 20}
        return [e.margin for e in margins_of(bare_flow(masks, [pair])).entries]

    assert margin("mask") == margin("lot") == margin("wafer") == margin("field")

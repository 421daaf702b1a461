"""Variants in a file: read with it, checked like a whole flow, faults at the variant's own lines."""

import textwrap

import jsonschema
import pytest

import flowplan
from flowplan.errors import FlowError, UsageError
from flowplan.files.reader import parse
from flowplan.model.schema import flow_schema

HEAD = """\
flow: Estuary
tools: {stepper: {alignment: 90, wafer_alignment: 5 um}}
masks:
  - {id: ACTIVE, tool: stepper, aligns_to: wafer}
  - {id: GATE, tool: stepper, aligns_to: ACTIVE}
  - {id: SD, tool: stepper, aligns_to: ACTIVE}
  - {id: CONTACT, tool: stepper, aligns_to: GATE}
pairs:
  - {name: drain, rule: overlap, between: [GATE, SD], drawn: 90}
  - {rule: enclosure, inner: CONTACT, outer: GATE, drawn: 500}
variants:
"""
FIRST = HEAD.count("\n") + 1


def read(variants: str):
    return parse(HEAD + textwrap.indent(textwrap.dedent(variants), "  "), "flow.yaml")


def found(variants: str) -> list[tuple[str, int, int]]:
    with pytest.raises(FlowError) as caught:
        read(variants)
    return [(d.code, d.span.line - FIRST + 1, d.span.column) for d in caught.value.diagnostics]


def test_a_variant_is_a_flow_of_its_own():
    loaded = read("- {name: direct, masks: {CONTACT: {aligns_to: ACTIVE}}}\n")
    assert list(loaded.variants) == ["direct"]
    changed = loaded.plan("direct")
    assert changed.masks[3].aligns_to.x[0].mask == "ACTIVE"
    assert loaded.plan().masks[3].aligns_to.x[0].mask == "GATE"
    assert (changed.variant, loaded.flow.variant) == ("direct", None)
    assert changed.heading == "Estuary, variant direct"


def test_the_document_says_which_variant_it_is_about():
    loaded = read("- {name: direct, masks: {CONTACT: {aligns_to: ACTIVE}}}\n")
    assert flowplan.analyse(loaded.plan("direct")).to_document()["variant"] == "direct"
    assert flowplan.analyse(loaded.flow).to_document()["variant"] is None


def test_a_step_becomes_self_aligned_under_its_own_id_and_pairs_stay():
    loaded = read("- {name: implant, self_aligned: {SD: {follows: GATE, tone: opposite}}}\n")
    result = flowplan.analyse(loaded.plan("implant"))
    drain = [e for e in result.entries if e.pair.name == "drain"]
    assert [m.id for m in result.flow.masks] == ["ACTIVE", "GATE", "CONTACT"]
    assert all(e.overlay.random == e.overlay.bound == e.overlay.offset == 0 for e in drain)


def test_lists_are_taken_by_id_as_well():
    loaded = read("- {name: direct, masks: [{id: CONTACT, aligns_to: ACTIVE}]}\n")
    assert loaded.plan("direct").masks[3].aligns_to.x[0].mask == "ACTIVE"
    assert len(loaded.plan("direct").masks) == 4


def test_a_pair_is_called_by_the_name_made_for_it():
    loaded = read("- {name: wider, pairs: {CONTACT inside GATE: {drawn: 600}}}\n")
    assert loaded.plan("wider").pairs[1].drawn.x.value == 600
    assert [p.name for p in read("- {name: fewer, drop: [CONTACT inside GATE]}\n").plan("fewer").pairs] == [
        "drain"
    ]


def test_dropping_a_mask_with_its_pair():
    loaded = read("- {name: fewer, drop: [SD, drain]}\n")
    assert [p.name for p in loaded.plan("fewer").pairs] == ["CONTACT inside GATE"]


def test_top_level_numbers():
    assert read("- {name: strict, confidence: 4, basis: rss}\n").plan("strict").confidence == 4


class TestFaults:
    def test_dropping_what_a_pair_needs_points_at_the_drop_and_names_the_pair(self):
        with pytest.raises(FlowError) as caught:
            read("- name: fewer\n  drop: [SD]\n")
        (finding,) = caught.value.diagnostics
        assert (finding.code, finding.span.line, finding.span.column) == ("FP301", FIRST + 1, 12)
        assert finding.message == "the variant drops 'SD', which the pair 'drain' needs"
        assert "drop or change the pair 'drain' too" in finding.hint

    def test_dropping_what_a_mask_reads(self):
        with pytest.raises(FlowError) as caught:
            read("- name: fewer\n  drop: [GATE, drain, CONTACT inside GATE]\n")
        (finding,) = caught.value.diagnostics
        assert finding.message == "the variant drops 'GATE', which the mask 'CONTACT' needs"

    def test_dropping_what_is_not_there(self):
        assert found("- name: fewer\n  drop: [GATTE]\n") == [("FP301", 2, 12)]

    def test_changing_a_mask_that_is_not_there(self):
        assert found("- name: direct\n  masks:\n    CONTAC: {aligns_to: ACTIVE}\n") == [("FP301", 3, 15)]

    def test_a_wrong_value_inside_a_variant(self):
        assert found("- name: direct\n  masks: {CONTACT: {aligns_to: NOWHERE}}\n") == [("FP301", 2, 34)]
        assert found("- name: wide\n  pairs: {drain: {drawn: -4}}\n") == [("FP206", 2, 28)]

    def test_an_unknown_key(self):
        with pytest.raises(FlowError) as caught:
            read("- {name: direct, mask: {CONTACT: {aligns_to: ACTIVE}}}\n")
        assert [(d.code, d.hint) for d in caught.value.diagnostics] == [("FP201", "did you mean 'masks'?")]

    def test_two_of_one_name(self):
        assert found("- {name: a, reserve: 0.1}\n- {name: a, reserve: 0.2}\n") == [("FP302", 2, 12)]

    def test_no_name(self):
        assert found("- {reserve: 0.1}\n") == [("FP202", 1, 5)]

    def test_parts_of_the_wrong_kind(self):
        assert found("- {name: a, masks: 3}\n") == [("FP203", 1, 22)]
        assert found("- {name: a, masks: [{aligns_to: ACTIVE}]}\n") == [("FP202", 1, 23)]
        assert found("- {name: a, drop: 3}\n") == [("FP203", 1, 21)]

    def test_order_that_a_variant_upsets_is_told_with_its_name(self):
        with pytest.raises(FlowError) as caught:
            read("- {name: odd, self_aligned: {GATE: {follows: CONTACT}}}\n")
        assert {d.span.line for d in caught.value.diagnostics} == {FIRST}
        assert all("CONTACT" in d.message or "GATE" in d.message for d in caught.value.diagnostics)

    def test_faults_of_the_base_are_told_once(self):
        text = (
            HEAD.replace("drawn: 90", "drawn: -90")
            + "  - {name: a, reserve: 0.1}\n  - {name: b, drop: [X]}\n"
        )
        with pytest.raises(FlowError) as caught:
            parse(text, "flow.yaml")
        assert [d.code for d in caught.value.diagnostics] == ["FP206", "FP301"]

    def test_asking_for_one_that_is_not_there(self):
        with pytest.raises(UsageError) as caught:
            read("- {name: direct, reserve: 0.1}\n").plan("dirct")
        (finding,) = caught.value.diagnostics
        assert (finding.code, finding.hint) == ("FP605", "did you mean 'direct'?")


class TestSchema:
    @pytest.mark.parametrize(
        "variant",
        [
            {"name": "a", "masks": {"CONTACT": {"aligns_to": "ACTIVE", "cd": None}}},
            {"name": "a", "masks": [{"id": "CONTACT", "aligns_to": ["ACTIVE", "GATE"]}]},
            {"name": "a", "pairs": {"drain": {"drawn": {"x": 1, "y": 2}}}, "drop": ["SD"]},
            {"name": "a", "tools": {"stepper": {"terms": {"stage": 3}}}, "reserve": "10 %"},
        ],
    )
    def test_partial_forms_are_known(self, variant):
        jsonschema.validate(self.flow(variant), flow_schema())

    @pytest.mark.parametrize(
        "variant",
        [
            {"masks": {}},
            {"name": "a", "masks": {"CONTACT": {"alignsto": "ACTIVE"}}},
            {"name": "a", "pairs": {"drain": {"drwn": 3}}},
            {"name": "a", "basis": "sum"},
        ],
    )
    def test_what_cannot_be_is_refused(self, variant):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate(self.flow(variant), flow_schema())

    @staticmethod
    def flow(variant):
        return {
            "flow": "Estuary",
            "masks": [{"id": "A", "tool": "t", "aligns_to": "wafer"}],
            "variants": [variant],
        }

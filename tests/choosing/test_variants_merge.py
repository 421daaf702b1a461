"""A variant is laid over the base key by key, and remembers where each value was written."""

from typing import Any

from flowplan.model.variants import merge_variant

BASE: dict[str, Any] = {
    "flow": "Estuary",
    "reserve": 0.1,
    "tools": {"stepper": {"alignment": 90, "terms": {"stage": 60, "lens": {"random": 45, "common": 0.8}}}},
    "masks": [
        {"id": "ACTIVE", "tool": "stepper", "aligns_to": "wafer"},
        {"id": "GATE", "tool": "stepper", "aligns_to": "ACTIVE", "cd": {"random": 70, "offset": -20}},
        {"id": "SD", "tool": "stepper", "aligns_to": "ACTIVE"},
        {"id": "CONTACT", "tool": "stepper", "aligns_to": {"x": "GATE", "y": "ACTIVE"}},
    ],
    "pairs": [
        {"name": "drain", "rule": "overlap", "between": ["GATE", "SD"], "drawn": 90},
        {"name": "pad", "rule": "enclosure", "inner": "CONTACT", "outer": "GATE", "drawn": 500},
    ],
}


def merged(**variant: Any):
    return merge_variant(BASE | {"variants": [{"name": "other"}, {"name": "this", **variant}]}, 1)


def test_base_is_left_as_it_was():
    before = repr(BASE)
    merged(masks={"GATE": {"cd": 1}}, drop=["pad"], tools={"stepper": {"alignment": 1}})
    assert repr(BASE) == before


def test_one_statement_of_a_mask_is_replaced_whole_and_the_others_stay():
    result = merged(masks={"CONTACT": {"aligns_to": "ACTIVE"}})
    assert result.data["masks"][3] == {"id": "CONTACT", "tool": "stepper", "aligns_to": "ACTIVE"}
    assert result.provenance.in_file(("masks", 3, "aligns_to", "x")) == (
        *("variants", 1, "masks", "CONTACT", "aligns_to"),
        "x",
    )
    assert result.provenance.in_file(("masks", 3, "tool")) == ("masks", 3, "tool")


def test_size_is_one_statement():
    assert merged(masks={"GATE": {"cd": {"random": 50}}}).data["masks"][1]["cd"] == {"random": 50}


def test_terms_merge_by_name_and_key():
    terms = merged(tools={"stepper": {"terms": {"lens": {"random": 30}}}}).data["tools"]["stepper"]["terms"]
    assert terms == {"stage": 60, "lens": {"random": 30, "common": 0.8}}


def test_null_takes_a_key_away():
    assert "cd" not in merged(masks={"GATE": {"cd": None}}).data["masks"][1]


def test_top_level_number_is_replaced():
    result = merged(reserve=0.2)
    assert result.data["reserve"] == 0.2
    assert result.provenance.in_file(("reserve",)) == ("variants", 1, "reserve")


def test_mask_that_becomes_self_aligned_keeps_its_id():
    result = merged(self_aligned={"SD": {"follows": "GATE", "tone": "opposite"}})
    assert [m["id"] for m in result.data["masks"]] == ["ACTIVE", "GATE", "CONTACT"]
    assert result.data["self_aligned"] == [{"id": "SD", "follows": "GATE", "tone": "opposite"}]
    assert result.provenance.in_file(("masks", 2, "aligns_to")) == ("masks", 3, "aligns_to")
    assert result.provenance.in_file(("self_aligned", 0, "tone")) == (
        *("variants", 1, "self_aligned", "SD"),
        "tone",
    )


def test_drop_takes_masks_and_pairs_and_later_places_stay_true():
    result = merged(drop=["ACTIVE", "drain"])
    assert [p["name"] for p in result.data["pairs"]] == ["pad"]
    assert result.provenance.in_file(("pairs", 0, "drawn")) == ("pairs", 1, "drawn")
    assert result.findings == ()


def test_new_pair_is_added_with_its_name():
    pair = {"rule": "spacing", "between": ["GATE", "CONTACT"], "drawn": 1}
    result = merged(pairs={"extra": pair})
    assert result.data["pairs"][2] == {"name": "extra", **pair}
    assert result.provenance.in_file(("pairs", 2)) == ("variants", 1, "pairs", "extra")


def test_dropping_what_is_not_there_names_the_nearest():
    (finding,) = merged(drop=["CONTCT"]).findings
    assert finding.path == ("variants", 1, "drop", 0)
    assert finding.hint == "did you mean 'CONTACT'?"


def test_changing_a_mask_that_is_not_there_is_told():
    (finding,) = merged(masks={"GAT": {"cd": 1}}).findings
    assert finding.path == ("variants", 1, "masks", "GAT")
    assert "'GATE'" in finding.hint

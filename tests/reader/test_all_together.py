"""All faults of a file are told in one run, in file order, and nothing that only follows from them."""

import pytest

from tests.reader.cases import findings, told

EVERY_KIND = """\
flow: Estuary
unitt: nm
sigma: 0
tools:
  stepper: {alignment: -30, terms: {lens: {random: 3, shape: bend}}}
masks:
  - {id: A, tool: steper, aligns_to: wafer}
  - {id: B, tool: stepper, aligns_to: C, cd: .nan}
  - {id: C, tool: stepper, aligns_to: [{mask: A, weight: 0.5}, {mask: B, weight: 0.4}]}
  - {id: E, tool: stepper, aligns_to: A}
  - {id: E, tool: stepper, aligns_to: A}
self_aligned:
  - {id: S, follows: Q}
pairs:
  - {name: p, rule: overlay, between: [A, A]}
  - {name: p, rule: spacing, between: [A, D]}
"""


def test_faults_of_every_kind_are_told_in_file_order():
    assert [(d.code, d.span.line, d.span.column) for d in findings(EVERY_KIND)] == [
        ("FP201", 2, 1),  # unitt
        ("FP206", 3, 8),  # sigma 0
        ("FP206", 5, 24),  # -30
        ("FP204", 5, 62),  # bend
        ("FP301", 7, 19),  # steper
        ("FP303", 8, 39),  # C does not exist yet
        ("FP207", 8, 46),  # .nan
        ("FP304", 9, 39),  # weights
        ("FP302", 11, 10),  # E twice
        ("FP301", 13, 22),  # Q
        ("FP305", 15, 43),  # A with itself
        ("FP202", 16, 5),  # drawn
        ("FP302", 16, 12),  # p twice
        ("FP301", 16, 43),  # D
    ]


def test_every_duplicate_key_of_a_file_is_told_with_all_other_faults():
    text = (
        "flow: a\nflow: b\ntools: {s: {}, s: {}}\nmasks:\n- {id: A, id: B, tool: !tag t, aligns_to: wafer}\n"
    )
    assert [(d.code, d.span.line, d.span.column) for d in findings(text) if d.severity == "error"] == [
        ("FP105", 2, 1),
        ("FP105", 3, 16),
        ("FP105", 5, 11),
        ("FP109", 5, 24),  # the tag of the tool t
        ("FP301", 5, 24),  # the tool t
    ]


ONE_FAULT = {
    "a mask without an id": ("{tool: s, aligns_to: wafer}", "FP202"),
    "a mask with a misspelt id key": ("{ids: A, tool: s, aligns_to: wafer}", "FP201"),
    "a mask whose id is a number": ("{id: 1, tool: s, aligns_to: wafer}", "FP203"),
    "a mask that is a text": ("A", "FP203"),
    "a mask that is nothing": ("", "FP203"),
    "a mask without a reference": ("{id: A, tool: s}", "FP202"),
    "a mask with a faulty reference": ("{id: A, tool: s, aligns_to: [{mask: wafer, weight: x}]}", "FP203"),
    "a mask without a tool": ("{id: A, aligns_to: wafer}", "FP202"),
    "a mask with a faulty size": ("{id: A, tool: s, aligns_to: wafer, cd: {random: .nan}}", "FP207"),
    "a mask with a faulty term": ("{id: A, tool: s, aligns_to: wafer, terms: {t: -3}}", "FP206"),
}


@pytest.mark.parametrize(("mask", "code"), ONE_FAULT.values(), ids=ONE_FAULT)
def test_a_faulty_mask_that_all_others_refer_to_is_one_fault(mask, code):
    others = "".join(f"  - {{id: M{i}, tool: s, aligns_to: A}}\n" for i in range(12))
    pairs = "".join(f"  - {{rule: overlay, between: [A, M{i}]}}\n" for i in range(12))
    text = f"flow: Estuary\ntools: {{s: {{}}}}\nmasks:\n  - {mask}\n{others}pairs:\n{pairs}"
    assert [(d.code, d.span.line) for d in findings(text)] == [(code, 4)]


@pytest.mark.parametrize("tool", ["", "30", "{alignment: -3}", "{alignmnt: 3}", "{terms: {t: {random: -3}}}"])
def test_a_faulty_tool_that_all_masks_use_is_one_fault(tool):
    masks = "".join(f"  - {{id: M{i}, tool: s, aligns_to: wafer}}\n" for i in range(12))
    text = f"flow: Estuary\ntools:\n  s: {tool}\nmasks:\n{masks}"
    assert [d.span.line for d in findings(text)] == [3]


def test_no_tools_at_all_is_one_fault():
    masks = "".join(f"  - {{id: M{i}, tool: s, aligns_to: wafer}}\n" for i in range(12))
    text = "flow: Estuary\nmasks:\n" + masks + "pairs: [{rule: overlay, between: [M0, M1]}]\n"
    assert [(d.code, d.message) for d in findings(text)] == [("FP205", "the flow has no tool")]


def test_no_masks_at_all_is_one_fault():
    text = "flow: Estuary\nmasks: []\npairs:\n  - {rule: overlay, between: [A, B]}\n"
    assert told(text) == (
        "FP205 2:8 the flow has no mask",
        "hint: list the masks in process order",
    )


SHARED = """\
flow: Estuary
tools: {{s: {{alignment: 3}}}}
masks:
  - {{id: A, tool: s, aligns_to: wafer, terms: {{t: {0}}}}}
  - {{id: B, tool: s, aligns_to: A, terms: {{t: {1}}}}}
pairs: [{{rule: overlay, between: [A, B]}}]
"""


@pytest.mark.parametrize(
    ("first", "second", "codes"),
    [
        (
            "{random: 3, shape: roll, source: e}",
            "{random: 2 urad, shape: skw, source: e}",
            ["FP204", "FP204"],
        ),
        ("{random: -3, source: e}", "{bound: x, source: e}", ["FP206", "FP203"]),
        ("{random: 3, shape: roll, source: e}", "{random: 2, source: e}", ["FP204"]),
        ("{random: -3, common: 0.5, source: e}", "{random: 2, common: 0.5}", ["FP206", "FP307"]),
    ],
)
def test_faulty_terms_that_share_a_source_are_not_compared(first, second, codes):
    assert [d.code for d in findings(SHARED.format(first, second))] == codes


def test_sound_terms_that_share_a_source_are_compared():
    assert told(SHARED.format("{random: 3, source: e}", "{bound: 2, source: e}"))[0] == (
        "FP307 5:66 source 'e' is quoted in other kinds elsewhere; they do not cancel"
    )
    text = SHARED.format("{random: 3, source: e}", "{random: 2 urad, shape: skew, source: e}")
    assert told("field: {x: 9 mm, y: 9 mm}\n" + text)[0] == (
        "FP307 6:85 source 'e' is a shift elsewhere, a skew here"
    )


@pytest.mark.parametrize("line", ["unit: parsec", "wafer: {diameter: -3}", "field: {x: 1, y: nothing}"])
def test_geometry_is_not_judged_by_what_is_left_of_it(line):
    parts = {"unit": "unit: um", "wafer": "wafer: {diameter: 150 mm}", "field": "field: {x: 15000, y: 15000}"}
    parts[line.partition(":")[0]] = line
    text = "\n".join(["flow: Estuary", *parts.values(), ""])
    text += "tools: {s: {alignment: 3, terms: {t: {random: 1 ppm, shape: scale, over: wafer}}}}\n"
    text += "masks: [{id: A, tool: s, aligns_to: wafer}, {id: B, tool: s, aligns_to: A}]\n"
    assert len(findings(text)) == 1


def test_places_stay_right_when_several_masks_of_a_long_list_are_dropped():
    masks = [f"  - {{id: M{i}, tool: s, aligns_to: wafer}}" for i in range(14)]
    masks[9] = "  - {tool: s, aligns_to: wafer}"
    masks[10] = "  - 3"
    masks[13] = "  - {id: M13, tool: t, aligns_to: wafer}"
    text = "flow: Estuary\ntools: {s: {}}\nmasks:\n" + "\n".join(masks) + "\n"
    assert [(d.code, d.span.line) for d in findings(text)] == [("FP202", 13), ("FP203", 14), ("FP301", 17)]

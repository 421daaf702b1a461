"""References are written back into a flow's text, all else kept to the letter."""

import difflib

import pytest

from flowplan.files.reader import parse
from flowplan.files.references import one_line, readings_data, references_data, write_references
from flowplan.files.yamltext import read_yaml
from flowplan.model.masks import References

TEXT = """\
flow: Estuary   # a comment
tools: {t: {alignment: 30}}
masks:
  - {id: A, tool: t, aligns_to: wafer, terms: {own: 5}}
  - {id: B, tool: t, aligns_to: A}   # why B reads A

  - id: C
    tool: t
    aligns_to:        # per axis
      x: B            # for the gate
      y: A
    notes: >-
      two lines
      of text
  - {id: "D 1", tool: t, aligns_to: [{mask: A, weight: 0.25}, {mask: B, weight: 0.75, alignment: 12}]}
pairs:
  - {rule: overlay, between: [A, C], limit: 90}
"""


def refs(value):
    return References.model_validate(value)


@pytest.mark.parametrize(
    "value",
    [
        "A",
        "wafer",
        {"x": "A", "y": "B"},
        ["A", "B"],
        {"x": ["A", "B"], "y": "B"},
        [{"mask": "A", "weight": 0.25}, {"mask": "B", "weight": 0.75, "alignment": 12}],
        {"mask": "A", "alignment": {"random": "0.02 um", "bound": {"x": 3, "y": 4.5}}},
        {"mask": "M 1: #2", "alignment": {"x": 1, "y": 2}},
        "007",
        "null",
        "- odd",
        "é\u2028".replace("\u2028", ""),
    ],
)
def test_one_line_reads_back_as_the_same_references(value):
    line = one_line(references_data(refs(value)))
    assert "\n" not in line
    data, _ = read_yaml(f"aligns_to: {line}\n", "text")
    assert refs(data["aligns_to"]) == refs(value)


def test_an_id_says_it_all_where_it_can():
    assert readings_data(refs("A").x) == "A"
    assert references_data(refs({"x": "A", "y": "A"})) == "A"
    assert one_line(references_data(refs({"x": "A", "y": "B"}))) == "{x: A, y: B}"


def test_only_the_lines_of_the_changed_masks_differ():
    flow = parse(TEXT).flow
    choices = {("B", "x"): refs("wafer").x, ("C", "x"): refs("A").x}
    written = write_references(TEXT, flow, choices)
    lines = [
        line for line in difflib.ndiff(TEXT.splitlines(), written.splitlines()) if line.startswith(("-", "+"))
    ]
    assert lines == [
        "-   - {id: B, tool: t, aligns_to: A}   # why B reads A",
        "+   - {id: B, tool: t, aligns_to: {x: wafer, y: A}}   # why B reads A",
        "-     aligns_to:        # per axis",
        "-       x: B            # for the gate",
        "-       y: A",
        "+     aligns_to: A",
        "+     # per axis",
        "+     # for the gate",
    ]
    again = parse(written).flow
    assert [m.aligns_to for m in again.masks[1:3]] == [refs({"x": "wafer", "y": "A"}), refs("A")]


def test_nothing_chosen_is_nothing_written():
    flow = parse(TEXT).flow
    assert write_references(TEXT, flow, {}) == TEXT
    assert write_references(TEXT, flow, {("B", "x"): refs("A").x}) == TEXT


def test_windows_line_ends_stay():
    text = TEXT.replace("\n", "\r\n")
    written = write_references(text, parse(text).flow, {("B", "y"): refs("wafer").x})
    assert written.count("\r\n") == written.count("\n") == TEXT.count("\n")

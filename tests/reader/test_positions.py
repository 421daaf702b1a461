"""A place is right whatever the line ends, marks, quotes, anchors and wide signs before it."""

import pytest

from flowplan.errors import FlowError
from flowplan.files.reader import parse, parse_bytes
from tests.reader.cases import FLOW, told

BAD = FLOW.replace("id: B, tool: s", "id: B, tool: t")
PLACE = "FP301 5:19 unknown tool 't'"


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"], ids=["unix", "windows", "old"])
def test_line_ends(end):
    assert told(BAD.replace("\n", end))[0] == PLACE


def test_a_byte_order_mark_is_no_column():
    with pytest.raises(FlowError) as error:
        parse_bytes(b"\xef\xbb\xbf" + b"flow: Estuary\nunitt: nm\nmasks: []\n", "f.yaml")
    assert str(error.value.diagnostics[0]) == "f.yaml:2:1: unknown key 'unitt' [FP201]"


def test_comments_empty_lines_and_a_document_start_count_as_lines():
    assert told("# a flow\n\n---\n" + BAD)[0] == PLACE.replace("5:", "8:")


def test_tabs_between_values_count_as_one_column():
    assert told(BAD.replace("id: B, tool: t", "id: B,\ttool:\tt"))[0] == PLACE


def test_wide_signs_count_as_one_column():
    assert told(BAD.replace("{id: B, tool: t", '{id: B, title: "µ→𝛔", tool: t'))[0] == PLACE.replace(
        "19", "33"
    )


def test_a_quoted_key_and_value_are_pointed_at_by_their_quote():
    assert told(BAD.replace("id: B, tool: t", '\'id\': B, "tool": "t"'))[0] == PLACE.replace("19", "23")


def test_a_block_text_does_not_move_what_follows():
    assert told("notes: |\n  one\n  two\n" + BAD)[0] == PLACE.replace("5:", "8:")


def test_an_anchor_is_read_and_a_fault_in_it_is_told_once_where_it_is_written():
    sound = FLOW.replace("alignment: 30,", "alignment: &size 30,").replace("limit: 90", "limit: *size")
    assert parse(sound).flow.pairs[0].limit.x.value == 30
    faulty = sound.replace("&size 30", "&size -30")
    assert told(faulty)[0] == "FP206 2:24 -30 is negative"
    assert [line.partition(" ")[0] for line in told(faulty)] == ["FP206", "hint:"]


def test_a_merge_key_gets_a_clear_message():
    text = FLOW.replace("- {id: B", "- &b {id: B").replace("pairs:", "  - {<<: *b, id: C}\npairs:")
    assert told(text) == (
        "FP109 6:6 merge keys are not used in a flow file",
        "hint: write the keys out",
    )


def test_a_quoted_merge_sign_is_an_ordinary_key():
    assert told('"<<": 3\n' + FLOW)[0] == "FP201 1:1 unknown key '<<'"


def test_a_finding_about_something_absent_points_at_what_lacks_it():
    text = "flow: Estuary\ntools: {s: {}}\nmasks:\n  - tool: s\n    aligns_to: wafer\n"
    assert told(text)[0] == "FP202 4:5 'id' is missing"


def test_a_fault_at_the_end_of_the_text_is_told_at_its_last_word():
    assert told("flow: Estuary\nmasks: [\n\n\n")[0].startswith("FP104 2:9 ")


def test_what_a_message_quotes_is_cut_short():
    (line, _hint) = told(FLOW.replace("alignment: 30", f"alignment: {'x' * 5000}"))
    assert line.startswith("FP203 2:24 'xxxx")
    assert "…" in line
    assert len(line) < 120


def test_aliases_that_nest_deeper_than_the_text_are_stopped():
    text = "a0: &a0 [1]\n" + "".join(f"a{i}: &a{i} [*a{i - 1}]\n" for i in range(1, 60))
    assert told(text) == (
        "FP106 1:10 nested too deeply",
        "hint: aliases make it so; write values out",
    )


def test_a_colon_too_many_in_the_first_line_and_after_a_comment():
    assert told("a: b: c\n")[0] == "FP104 1:5 a `:` where no `key: value` can stand"
    assert told("# comment\na: b: c\n")[0] == "FP104 2:5 a `:` where no `key: value` can stand"
    assert told("a: b\n\n  c: d\n")[0] == "FP104 3:4 a `:` where no `key: value` can stand"

"""Values are replaced in the text, and nothing else of it moves."""

import pytest

from flowplan.errors import UsageError
from flowplan.files.rewrite import replace_values
from flowplan.files.yamltext import read_yaml

TEXT = """\
# héad µ comment
masks:
  - id: A   # first
    aligns_to: wafer  # why
  - {id: B, aligns_to: {x: A, y: wafer}, cd: 3}   # keep
  - id: C
    # before
    aligns_to:
      # inside one
      - A   # inside two
      - mask: B
        weight: 0.5

    # after C
    cd: 4
  - id: D
    aligns_to: &pair [A, B]
  - {id: E, aligns_to: *pair, cd: 4}
"""


def changed(path: tuple[str | int, ...], new: str) -> str:
    return replace_values(TEXT, {path: new})


def lines_that_differ(text: str) -> list[str]:
    old = TEXT.splitlines()
    return [line for line in text.splitlines() if line not in old]


def test_scalar_keeps_its_line_and_comment():
    assert lines_that_differ(changed(("masks", 0, "aligns_to"), "B")) == ["    aligns_to: B  # why"]


def test_value_inside_braces_keeps_the_rest_of_the_line():
    assert lines_that_differ(changed(("masks", 1, "aligns_to"), "[A, wafer]")) == [
        "  - {id: B, aligns_to: [A, wafer], cd: 3}   # keep"
    ]


def test_block_becomes_one_line_and_its_comments_follow():
    text = changed(("masks", 2, "aligns_to"), "A")
    assert lines_that_differ(text) == ["    aligns_to: A", "    # inside one", "    # inside two"]
    assert "    # before\n    aligns_to: A\n" in text
    assert "\n\n    # after C\n    cd: 4\n" in text


def test_alias_is_replaced_where_it_stands_and_the_anchor_stays():
    data, _ = read_yaml(changed(("masks", 4, "aligns_to"), "A"), "t")
    assert data["masks"][3]["aligns_to"] == ["A", "B"]
    assert data["masks"][4] == {"id": "E", "aligns_to": "A", "cd": 4}


def test_anchored_value_keeps_its_anchor():
    text = changed(("masks", 3, "aligns_to"), "[A, C]")
    assert "    aligns_to: &pair [A, C]" in text.splitlines()


def test_several_values_at_once_leave_every_comment():
    text = replace_values(TEXT, {("masks", i, "aligns_to"): "wafer" for i in range(3)})
    data, _ = read_yaml(text, "t")
    assert [m["aligns_to"] for m in data["masks"][:3]] == ["wafer"] * 3
    for comment in (
        "héad µ comment",
        "first",
        "why",
        "keep",
        "before",
        "inside one",
        "inside two",
        "after C",
    ):
        assert f"# {comment}" in text


def test_windows_line_ends_stay():
    text = replace_values(TEXT.replace("\n", "\r\n"), {("masks", 0, "aligns_to"): "B"})
    assert text.count("\r\n") == TEXT.count("\n")
    assert "aligns_to: B  # why\r\n" in text


@pytest.mark.parametrize("path", [("masks", 9, "aligns_to"), ("tools",), ("masks", 0, "cd", "random")])
def test_place_that_is_not_there_is_told(path: tuple[str | int, ...]):
    with pytest.raises(UsageError, match="does not stand in the file"):
        changed(path, "1")

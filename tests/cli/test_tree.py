"""``flowplan tree`` shows who aligns to whom."""

from pathlib import Path

import pytest

FLOW = """\
flow: Estuary
tools: {s: {alignment: 30}}
masks:
  - {id: A, tool: s, aligns_to: wafer}
  - {id: B, tool: s, aligns_to: A}
  - {id: C, tool: s, aligns_to: {x: B, y: A}}
  - {id: D, tool: s, aligns_to: [{mask: C, weight: 0.75}, {mask: B, weight: 0.25}]}
  - {id: E, tool: s, aligns_to: D, side: back}
  - {id: F, tool: s, aligns_to: A}
self_aligned:
  - {id: S, follows: B}
  - {id: T, follows: {x: B, y: A}}
pairs: [{rule: overlay, between: [A, E]}]
"""


@pytest.fixture
def file(tmp_path):
    (tmp_path / "f.yaml").write_text(FLOW)
    return "f.yaml"


def test_the_longest_descent_keeps_its_column_and_the_rest_branches_off(run, file):
    result = run("tree", file)
    assert result.exit_code == 0
    assert result.stdout.splitlines()[2:] == [
        "   layer  aligns to",
        "   wafer",
        "1  A      wafer",
        "6  ├─ F   A",
        "2  B      A",
        "   ├─ S   B (self-aligned)",
        "   ├─ T   x: B, y: A (self-aligned)",
        "3  C      x: B, y: A",
        "4  D      C 75 %, B 25 %",
        "5  E      D (back side)",
    ]


def test_one_axis_alone_names_only_its_references(run, file):
    lines = run("tree", file, "--axis", "y").stdout.splitlines()
    assert lines[1].endswith("along y")
    assert lines[4:] == [
        "1  A      wafer",
        "2  ├─ B   A",
        "   │  S   B (self-aligned)",
        "   ├─ T   A (self-aligned)",
        "6  ├─ F   A",
        "3  C      A",
        "4  D      C 75 %, B 25 %",
        "5  E      D (back side)",
    ]


def test_sixty_masks_in_a_row_stay_within_80_columns(run, tmp_path):
    masks = ["  - {id: L0, tool: s, aligns_to: wafer}"]
    for i in range(1, 60):
        masks.append(f"  - {{id: L{i}, tool: s, aligns_to: L{i - 1}}}")
        masks.append(f"  - {{id: SIDE{i}, tool: s, aligns_to: L{i - 1}}}")
    text = "flow: deep\ntools: {s: {alignment: 3}}\nmasks:\n" + "\n".join(masks)
    (tmp_path / "deep.yaml").write_text(text + "\npairs: [{rule: overlay, between: [L0, L9]}]\n")
    lines = run("tree", "deep.yaml").stdout.splitlines()
    assert len(lines) == 3 + 1 + 119
    assert max(map(len, lines)) <= 80


@pytest.mark.parametrize(
    ("name", "begins"), [("t.svg", b"<?xml"), ("t.png", b"\x89PNG"), ("t.dot", b"digraph")]
)
def test_a_drawing_is_written_in_the_form_that_its_name_says(run, file, name, begins):
    result = run("tree", file, "-o", name)
    assert (result.exit_code, result.stdout, result.stderr) == (0, "", f"wrote {name}\n")
    assert begins in Path(name).read_bytes()[:2000]


def test_an_unknown_kind_of_drawing_is_refused(run, file):
    result = run("tree", file, "-o", "t.jpg")
    assert result.exit_code == 2
    assert "end the name in .svg, .png, .dot" in result.stderr
    assert not Path("t.jpg").exists()


def test_a_drawing_of_one_axis_is_refused_since_it_shows_both(run, file):
    assert run("tree", file, "-o", "t.svg", "--axis", "x").exit_code == 2


def test_a_drawing_that_cannot_be_written_is_told(run, file):
    result = run("tree", file, "-o", "nowhere/t.svg")
    assert result.exit_code == 2
    assert "[FP501]" in result.stderr

"""``flowplan remedies`` ranks what to do about each pair that does not pass."""

import json

import pytest


def test_table_ranks_what_helps(run, flow):
    result = run("remedies", flow, "--pair", "third", "--each", "1")
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert lines[:6] == [
        "Estuary four masks, revision A",
        "lengths in nm, mixed basis, 3 sigma",
        "",
        "third along x: margin -1.96 nm, fail",
        "chain B - A - C - D",
        "  change                                     margin  verdict  worst  fail  worse",
    ]
    assert all(len(line) <= 80 for line in lines)


def test_every_kind_that_helps_is_there(run, flow):
    document = json.loads(run("remedies", flow, "--format", "json").stdout)
    assert (document["failing"], document["worst"]) == (1, pytest.approx(50 - 30 * 3**0.5))
    cases = {case["pair"]: case for case in document["cases"]}
    assert list(cases) == ["second", "third"]  # tight and failing
    kinds = {remedy["kind"] for remedy in cases["third"]["remedies"]}
    assert kinds == {"direct", "reference", "average", "self-align", "rule", "size"}


def test_json_of_a_reading_and_of_a_size(run, flow):
    document = json.loads(run("remedies", flow, "--pair", "third", "--format", "json").stdout)
    found = document["cases"][0]["remedies"]
    direct = next(r for r in found if r["kind"] == "direct" and r["change"]["axes"] == ["x"])
    assert direct["change"] == {
        "mask": "D",
        "axes": ["x"],
        "from": {"x": [{"mask": "C", "weight": 1.0}]},
        "to": {"x": [{"mask": "B", "weight": 1.0}]},
    }
    assert (direct["margin"], direct["verdict"], direct["failing"]) == (20, "pass", 0)
    assert (direct["others_worse"], direct["others_broken"]) == (0, 0)
    size = next(r for r in found if r["kind"] == "size")
    assert size["change"]["path"] == "tools.stepper.alignment"
    assert size["for_zero"] == pytest.approx(50 / 3**0.5)
    assert size["for_reserve"] == pytest.approx(45 / 3**0.5)
    assert size["change"]["to"] == size["for_reserve"]


def test_sentence_can_be_pasted_into_a_review(run, flow):
    document = json.loads(run("remedies", flow, "--pair", "third", "--format", "json").stdout)
    found = document["cases"][0]["remedies"]
    direct = next(r for r in found if r["kind"] == "direct" and r["change"]["axes"] == ["x"])
    assert direct["text"] == (
        "Align D to B along x instead of C: the margin of third along x goes from -1.96 to 20.00 nm "
        "(fail to pass); the worst margin of the flow is then 2.57 nm, 0 fail instead of 1; no other "
        "margin gets smaller."
    )
    rule = next(r for r in found if r["kind"] == "rule")
    assert rule["text"].startswith(
        "Allow 57.74 instead of 50.00 nm along x: the margin of third along x goes from -1.96 to 5.77 nm "
        "(fail to pass); that also leaves the reserve (51.97 leaves 0);"
    )


def test_change_that_is_not_enough_alone_says_so(run, flow, tmp_path):
    text = (
        (tmp_path / flow).read_text().replace("id: C, tool: stepper", "id: C, tool: stepper, mark_reading: 9")
    )
    (tmp_path / "weak.yaml").write_text(text)
    document = json.loads(run("remedies", "weak.yaml", "--pair", "third", "--format", "json").stdout)
    weak = next(
        r for r in document["cases"][0]["remedies"] if r["change"].get("path") == "masks.C.mark_reading"
    )
    assert (weak["enough"], weak["for_zero"], weak["for_reserve"]) == (False, None, None)
    assert "not enough alone" in weak["text"]
    assert "still fails" in weak["text"]
    table = run("remedies", "weak.yaml", "--each", "9", "--format", "markdown").stdout
    assert "| Remove masks.C.mark\\_reading, now 9 nm: not enough alone |" in table


def test_markdown_lists_the_sentences(run, flow):
    text = run("remedies", flow, "--pair", "third", "--format", "markdown").stdout
    assert text.startswith("# Estuary four masks, revision A: remedies\n\nLengths in nm.\n")
    assert "\n## third along x: margin -1.96 nm, fail\n" in text
    assert "\n- Align D to B along x instead of C: the margin of third" in text


def test_flow_that_passes_needs_nothing(run, sound_flow, tmp_path):
    text = (tmp_path / sound_flow).read_text().replace("reserve: 10 %", "reserve: 0")
    (tmp_path / "fine.yaml").write_text(text)
    result = run("remedies", "fine.yaml")
    assert result.exit_code == 0
    assert "every judged pair passes: there is nothing to mend" in result.stdout
    assert "first along x" in run("remedies", "fine.yaml", "--all").stdout


def test_unknown_pair_is_refused_with_the_nearest(run, flow):
    result = run("remedies", flow, "--pair", "thrid")
    assert result.exit_code == 2
    assert "unknown pair 'thrid' [FP602]" in result.stderr
    assert "did you mean 'third'?" in result.stderr


def test_help_shows_an_example(run):
    assert "Example: flowplan remedies" in run("remedies", "--help").stdout


def test_rule_with_a_drawn_dimension_is_drawn_wider(run, flow, tmp_path):
    drawn = "rule: spacing, between: [B, D], drawn: 50, axes: x"
    text = (tmp_path / flow).read_text().replace("rule: overlay, between: [B, D], limit: 50, axes: x", drawn)
    (tmp_path / "drawn.yaml").write_text(text)
    document = json.loads(run("remedies", "drawn.yaml", "--pair", "third", "--format", "json").stdout)
    rule = next(r for r in document["cases"][0]["remedies"] if r["kind"] == "rule")
    assert rule["text"].startswith("Draw 57.74 instead of 50.00 nm along x:")
    assert rule["change"] == {"pair": "third", "axis": "x", "from": 50.0, "to": rule["for_reserve"]}

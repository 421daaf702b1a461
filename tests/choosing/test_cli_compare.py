"""``flowplan compare`` and ``--variant``, as typed."""

import json
from pathlib import Path

import pytest

from tests.choosing.conftest import Cli

FLOW = """\
flow: Estuary
tools: {stepper: {alignment: 90, wafer_alignment: 5 um}}
masks:
  - {id: ACTIVE, tool: stepper, aligns_to: wafer}
  - {id: GATE, tool: stepper, aligns_to: ACTIVE}
  - {id: SD, tool: stepper, aligns_to: ACTIVE}
  - {id: CONTACT, tool: stepper, aligns_to: GATE}
pairs:
  - {name: drain, rule: overlap, between: [GATE, SD], drawn: 100, axes: x}
  - {name: pad, rule: enclosure, inner: CONTACT, outer: ACTIVE, drawn: 120, axes: x}
  - {name: gate pad, rule: enclosure, inner: CONTACT, outer: GATE, drawn: 120, axes: x}
"""
VARIANTS = """\
variants:
  - {name: direct, note: one mark in both axes, masks: {CONTACT: {aligns_to: ACTIVE}}}
  - {name: implant, self_aligned: {SD: {follows: GATE}}}
"""


@pytest.fixture
def file(tmp_path: Path) -> Path:
    path = tmp_path / "flow.yaml"
    path.write_text(FLOW + VARIANTS, encoding="utf-8")
    return path


@pytest.fixture
def plain(tmp_path: Path) -> Path:
    path = tmp_path / "plain.yaml"
    path.write_text(FLOW, encoding="utf-8")
    return path


def document(cli: Cli, *arguments: object):
    return json.loads(cli("compare", *arguments, "--format", "json").out)


class TestOneFile:
    def test_its_variants_stand_beside_its_own_plan(self, cli, file):
        found = document(cli, file)
        assert [p["name"] for p in found["plans"]] == ["the file's own plan", "direct", "implant"]
        assert found["plans"][1]["note"] == "one mark in both axes"
        assert found["plans"][1]["changes"] == [
            {"part": "masks", "of": "CONTACT", "what": f"aligns_to.{a}", "before": "GATE", "after": "ACTIVE"}
            for a in "xy"
        ]
        by_pair = {row["pair"]: row for row in found["margins"]}
        hop, two = 90.0, 90 * 2**0.5
        assert by_pair["pad"]["margin"] == pytest.approx([120 - two, 120 - hop, 120 - two])
        assert by_pair["gate pad"]["status"] == [None, "worse", "same"]
        assert by_pair["drain"]["status"] == [None, "same", "settled"]
        assert by_pair["drain"]["verdict"] == ["fail", "fail", "pass"]
        assert by_pair["drain"]["change"] == pytest.approx([None, 0, two])

    def test_one_variant_alone(self, cli, file):
        assert [p["name"] for p in document(cli, file, "--variant", "implant")["plans"]][1:] == ["implant"]

    def test_the_table_says_what_changed_first_then_what_moved(self, cli, file):
        out = cli("compare", file, "--variant", "implant").out
        assert out.index("mask SD") < out.index("change  verdict")
        assert "fail to pass, settled" in out
        assert "settles drain (x)" in out
        assert "pad" not in out.split("verdict")[-1].replace("gate pad", "")
        assert max(map(len, out.splitlines())) <= 80

    def test_all_shows_what_stays(self, cli, file):
        assert "gate pad" in cli("compare", file, "--variant", "implant", "--all").out

    def test_many_plans_stand_three_abreast(self, cli, file, tmp_path):
        more = "".join(f"  - {{name: v{i}, confidence: {i}}}\n" for i in range(1, 5))
        path = tmp_path / "many.yaml"
        path.write_text(FLOW + VARIANTS + more, encoding="utf-8")
        out = cli("compare", path).out
        heads = [line.split() for line in out.splitlines() if line.startswith("pair ")]
        assert [[w for w in head if len(w) == 1] for head in heads] == [list("ABCD"), list("AEFG")]

    def test_a_settled_pair_that_comes_undone(self, cli, tmp_path):
        path = tmp_path / "flow.yaml"
        base = FLOW.replace("  - {id: SD, tool: stepper, aligns_to: ACTIVE}\n", "")
        masked = "  - {name: masked, masks: {SD: {after: GATE, tool: stepper, aligns_to: ACTIVE}}}\n"
        path.write_text(
            base + "self_aligned: [{id: SD, follows: GATE}]\nvariants:\n" + masked, encoding="utf-8"
        )
        found = document(cli, path)
        assert found["margins"][0]["status"] == [None, "unsettled"]
        assert "pass to fail, no longer settled" in cli("compare", path).out

    def test_markdown(self, cli, file):
        out = cli("compare", file, "--format", "markdown").out
        assert "| A | the file's own plan | 1 | 0 | 2 |" in out
        assert "| B | mask CONTACT | aligns\\_to | GATE | ACTIVE |" in out


class TestFiles:
    def test_the_first_is_what_the_others_are_measured_against(self, cli, plain, tmp_path):
        other = tmp_path / "other.yaml"
        other.write_text(
            FLOW.replace("drawn: 100", "drawn: 140").replace("name: pad", "name: hole"), encoding="utf-8"
        )
        found = document(cli, plain, other)
        assert [p["name"] for p in found["plans"]] == ["plain", "other"]
        assert {r["pair"]: r["status"][1] for r in found["margins"]} == {
            "drain": "better", "pad": "disappears", "gate pad": "same", "hole": "appears",
        }  # fmt: skip
        out = cli("compare", plain, other).out
        assert "is gone" in out
        assert "appears" in out

    def test_files_of_one_name_keep_their_folders(self, cli, plain, tmp_path):
        (tmp_path / "b").mkdir()
        other = tmp_path / "b" / "plain.yaml"
        other.write_text(FLOW, encoding="utf-8")
        assert [p["name"] for p in document(cli, plain, other)["plans"]] == [str(plain), str(other)]
        assert "no margin moves" in cli("compare", plain, other).out

    def test_five_are_too_many(self, cli, plain):
        ended = cli("compare", *[plain] * 5)
        assert (ended.status, "5 files are named" in ended.err) == (2, True)

    def test_variants_belong_to_one_file(self, cli, plain, file):
        ended = cli("compare", plain, file, "--variant", "direct")
        assert (ended.status, "one file" in ended.err) == (2, True)


class TestSelfAlign:
    def test_without_editing_the_file(self, cli, plain):
        found = document(cli, plain, "--self-align", "SD:GATE")
        assert found["plans"][1]["name"] == "SD self-aligned to GATE"
        assert found["margins"][0]["status"] == [None, "settled"]

    def test_along_one_axis(self, cli, plain):
        found = document(cli, plain, "--self-align", "SD:GATE:y")
        assert found["margins"][0]["status"] == [None, "better"]

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            ("SD", "does not name a feature and its parent"),
            ("SD:GATE:z", "does not name a feature and its parent"),
            ("SD:", "does not name a feature and its parent"),
            ("SDD:GATE", "did you mean 'SD'?"),
            ("SD:GAT", "did you mean 'GATE'?"),
            ("GATE:CONTACT", "--self-align GATE:CONTACT"),
        ],
    )
    def test_what_cannot_be(self, cli, plain, text, message):
        ended = cli("compare", plain, "--self-align", text)
        assert ended.status == 2
        assert message in ended.err


def test_nothing_to_compare_with(cli, plain):
    ended = cli("compare", plain)
    assert ended.status == 2
    assert "--self-align" in ended.err


def test_check_names_the_variants(cli, file):
    assert "  variants  direct, implant\n" in cli("check", file).out
    assert "variants" not in cli("check", file, "--variant", "direct").out


def test_unknown_variant(cli, file):
    for command in ("check", "margins", "tree", "report", "compare"):
        ended = cli(command, file, "--variant", "dirct")
        assert (ended.status, "did you mean 'direct'?" in ended.err) == (2, True)


def test_every_command_takes_a_variant(cli, file, tmp_path):
    assert "variant direct" in cli("check", file, "--variant", "direct").out
    assert "variant direct" in cli("margins", file, "--variant", "direct").out
    assert (
        json.loads(cli("margins", file, "--variant", "direct", "--format", "json").out)["variant"] == "direct"
    )
    assert "CONTACT reads ACTIVE" in cli("chain", file, "ACTIVE", "CONTACT", "--variant", "direct").out
    assert "variant direct" in cli("tree", file, "--variant", "direct").out
    page = tmp_path / "direct.html"
    assert cli("report", file, "--variant", "direct", "-o", page).status == 0
    text = page.read_text(encoding="utf-8")
    assert "<dt>Variant</dt><dd>direct</dd>" in text
    assert "Plans compared" not in text


class TestPages:
    def test_the_report_compares_the_variants(self, cli, file, tmp_path):
        page = tmp_path / "flow.html"
        assert cli("report", file, "-o", page).status == 0
        assert 'id="plans"' in page.read_text(encoding="utf-8")

    def test_a_page_of_its_own_lets_nothing_run_and_escapes(self, cli, tmp_path):
        path, page = tmp_path / "flow.yaml", tmp_path / "plans.html"
        hostile = VARIANTS.replace("name: direct", "name: '<script>alert(1)</script>'")
        path.write_text(FLOW + hostile, encoding="utf-8")
        assert cli("compare", path, "-o", page).status == 0
        text = page.read_text(encoding="utf-8")
        assert "<script" not in text
        assert "&lt;script&gt;alert(1)" in text
        assert "script-src &#39;none&#39;" in text

    def test_the_flow_itself_is_not_overwritten(self, cli, file):
        before = file.read_text(encoding="utf-8")
        assert cli("compare", file, "-o", file).status == 2
        assert file.read_text(encoding="utf-8") == before

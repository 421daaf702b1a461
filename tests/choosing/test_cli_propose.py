"""``flowplan propose``, as typed: the plan, its proof, and the file it writes."""

import difflib
import json
from pathlib import Path

import pytest

import flowplan
from flowplan.engine.propose import Progress
from flowplan.files.reader import parse
from tests.choosing.conftest import Cli

#: B reads A, C reads B, D reads C: D to A is 30 sqrt(3) nm; direct it is 30.
CHAIN = """\
flow: Estuary chain   # a comment that stays
tools: {t: {alignment: 30}}
masks:
  - {id: A, tool: t, aligns_to: wafer}
  - {id: B, tool: t, aligns_to: A}
  - {id: C, tool: t, aligns_to: B, may_align_to: [A]}   # may skip B

  - id: D
    tool: t
    aligns_to: C     # the last one
    may_align_to: [A, {x: B, y: C}]
pairs:
  - {name: far, rule: overlay, between: [A, D], limit: 40}
  - {name: near, rule: overlay, between: [C, D], limit: 60}
variants:
  - {name: strict, pairs: {far: {limit: 35}}}
"""


@pytest.fixture
def file(tmp_path: Path) -> Path:
    path = tmp_path / "chain.yaml"
    path.write_text(CHAIN, encoding="utf-8")
    return path


def document(cli: Cli, *arguments: object):
    ended = cli("propose", *arguments, "--format", "json")
    assert ended.status == 0, ended.err
    return json.loads(ended.out)


def test_the_best_plan_with_its_proof(cli, file):
    found = document(cli, file)
    assert (found["goal"], found["proved"]) == ("worst", True)
    assert found["worst_before"] == pytest.approx(40 - 30 * 3**0.5)
    # D direct on A: 10 left of 40. C then lies two readings from D, by A: 60 - 42.4.
    assert found["worst_after"] == found["bound"] == pytest.approx(10)
    assert [{k: c[k] for k in ("mask", "axis", "from", "to")} for c in found["changes"]] == [
        {"mask": m, "axis": a, "from": f, "to": "A"} for a in "xy" for m, f in (("C", "B"), ("D", "C"))
    ]
    assert {m["pair"] for m in found["margins"]} == {"far", "near"}


def test_table(cli, file):
    out = cli("propose", file).out
    assert "optimal: no choice among these references is better" in out
    assert "fail to pass" in out
    assert max(map(len, out.splitlines())) <= 80


def test_at_most_one_change(cli, file):
    found = document(cli, file, "--changes", 1)
    assert {c["mask"] for c in found["changes"]} == {"D"}
    assert "at most 1 mask is better" in cli("propose", file, "--changes", 1).out


def test_no_change_allowed_keeps_the_plan(cli, file):
    assert document(cli, file, "--changes", 0)["changes"] == []
    assert "the plan in the file is kept" in cli("propose", file, "--changes", 0).out


def test_ladder(cli, file):
    found = json.loads(cli("propose", file, "--ladder", "--format", "json").out)
    assert [(s["at_most"], s["proved"]) for s in found["ladder"]][:2] == [(0, True), (1, True)]
    assert (found["fewest_changes"], found["fewest_proved"]) == (1, True)
    out = cli("propose", file, "--ladder").out
    assert "1 changed mask and no pair fails" in out
    assert "| 1 | 8.04 | +20.00 |" in cli("propose", file, "--ladder", "--format", "markdown").out


def test_goals(cli, file):
    assert document(cli, file, "--goal", "fails")["bound"] == 0
    assert document(cli, file, "--goal", "yield")["bound"] <= 0


def test_free_takes_several_with_commas(cli, file):
    assert document(cli, file, "--free", "B,C", "--pin", "D")["proved"]


def test_strict(cli, file):
    assert cli("propose", file, "--changes", 0, "--strict").status == 1
    assert cli("propose", file, "--strict").status == 0


def test_variant(cli, file):
    assert document(cli, file, "--variant", "strict")["worst_after"] == pytest.approx(5)


class TestWriting:
    def test_the_flow_with_the_new_references_and_every_other_line_as_it_was(self, cli, file, tmp_path):
        target = tmp_path / "better.yaml"
        ended = cli("propose", file, "-o", target)
        assert (ended.status, "wrote" in ended.err) == (0, True)
        written = target.read_text(encoding="utf-8")
        changed = [d for d in difflib.ndiff(CHAIN.splitlines(), written.splitlines()) if d[0] in "+-"]
        assert changed == [
            "-   - {id: C, tool: t, aligns_to: B, may_align_to: [A]}   # may skip B",
            "+   - {id: C, tool: t, aligns_to: A, may_align_to: [A]}   # may skip B",
            "-     aligns_to: C     # the last one",
            "+     aligns_to: A     # the last one",
        ]
        margin = flowplan.analyse(parse(written).flow).worst.margin.mixed
        assert margin == pytest.approx(10)

    def test_not_over_the_flow_itself(self, cli, file):
        assert cli("propose", file, "-o", file).status == 2
        assert file.read_text(encoding="utf-8") == CHAIN

    def test_not_for_a_variant(self, cli, file, tmp_path):
        ended = cli("propose", file, "--variant", "strict", "-o", tmp_path / "better.yaml")
        assert (ended.status, "variant" in ended.err) == (2, True)


class TestQuestionsThatDoNotFit:
    @pytest.mark.parametrize(
        ("options", "message"),
        [
            (["--free", "E"], "E"),
            (["--pin", "BB"], "BB"),
            (["--free", "B", "--pin", "B"], "both freed and pinned"),
            (["--ladder", "--changes", "1"], "every number of changes"),
            (["--changes", "-1"], "--changes"),
        ],
    )
    def test_are_refused(self, cli, file, options, message):
        ended = cli("propose", file, *options)
        assert ended.status == 2
        assert message in ended.err

    def test_no_mask_has_a_choice(self, cli, tmp_path):
        path = tmp_path / "plain.yaml"
        path.write_text(
            CHAIN.replace(", may_align_to: [A]", "").replace("    may_align_to: [A, {x: B, y: C}]\n", ""),
            encoding="utf-8",
        )
        ended = cli("propose", path)
        assert ended.status == 2
        assert "no mask has a choice of references" in ended.err

    def test_a_candidate_that_comes_later_is_told_with_its_place(self, cli, tmp_path):
        path = tmp_path / "late.yaml"
        path.write_text(CHAIN.replace("may_align_to: [A]}", "may_align_to: [D]}"), encoding="utf-8")
        ended = cli("propose", path)
        assert ended.status == 2
        assert ":6:51: 'C' may align to 'D', which does not exist yet at that point" in ended.err


def test_an_interrupt_keeps_the_best_plan_so_far(cli, file, monkeypatch):
    import signal

    def impatient(flow, *, progress, stop, **more):
        signal.raise_signal(signal.SIGINT)
        assert stop()
        progress(Progress("worst", 1.0, 2.0, 0.5, 10))
        return flowplan.engine.propose.propose(flow, stop=stop, **more)

    monkeypatch.setattr("flowplan.cli.propose.propose", impatient)
    ended = cli("propose", file)
    assert ended.status == 0
    assert "interrupted: this is the best plan found so far" in ended.err


def test_the_report_shows_the_ladder_and_what_would_help(cli, file, tmp_path):
    page = tmp_path / "chain.html"
    assert cli("report", file, "-o", page).status == 0
    text = page.read_text(encoding="utf-8")
    assert 'id="ladder"' in text
    assert "1 changed mask and no pair fails" in text
    assert 'id="remedies"' in text
    assert "Align D to A" in text

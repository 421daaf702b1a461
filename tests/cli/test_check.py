"""``flowplan check`` tells what is wrong and where, or sums up a sound flow."""

import json
import subprocess
import sys
from pathlib import Path


def test_a_sound_flow_is_summed_up_on_standard_output(run, flow):
    result = run("check", flow)
    assert result.exit_code == 0
    assert result.stderr == ""
    assert result.stdout.splitlines() == [
        "Estuary four masks, revision A: sound",
        "  masks     4 on 1 tool",
        "  pairs     4, judged as 4 margins",
        "  verdicts  1 pass, 1 tight, 1 fail, 1 unjudged (mixed basis, 3 sigma)",
        "  worst     third along x, margin -1.96 nm, fail",
    ]


def test_every_mistake_is_told_at_its_place_with_a_caret_and_a_hint(run, tmp_path):
    text = "flow: Estuary\nwafr: 3\ntools: {stepper: {alignment: -9}}\nmasks:\n"
    text += "  - {id: A, tool: steper, aligns_to: wafer}\n"
    (tmp_path / "bad.yaml").write_text(text)
    result = run("check", "bad.yaml")
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.splitlines() == [
        "bad.yaml:2:1: unknown key 'wafr' [FP201]",
        "    wafr: 3",
        "    ^",
        "    hint: did you mean 'wafer'?",
        "bad.yaml:3:30: -9 is negative [FP206]",
        "    tools: {stepper: {alignment: -9}}",
        "                                 ^",
        "    hint: a size is 0 or more; only offsets have a sign",
        "bad.yaml:5:19: unknown tool 'steper' [FP301]",
        "    - {id: A, tool: steper, aligns_to: wafer}",
        "                    ^",
        "    hint: did you mean 'stepper'?",
        "3 errors",
    ]


def test_a_long_line_is_cut_around_the_place(run, tmp_path):
    text = "flow: Estuary\nmasks: [{title: " + "a" * 200 + ", idd: A}]\n"
    (tmp_path / "long.yaml").write_text(text)
    lines = run("check", "long.yaml").stderr.splitlines()
    at = next(i for i, line in enumerate(lines) if "'idd'" in line)
    assert lines[at + 1].index("idd") == lines[at + 2].index("^")
    assert len(lines[at + 1]) <= 80


def test_a_tab_or_a_wide_sign_before_the_place_keeps_the_caret_in_line(run):
    result = run("check", "-", stdin='flow: "a\tµ→", wafr: 3')
    place, excerpt, caret = result.stderr.splitlines()[:3]
    assert place.startswith("<stdin>:1:")
    assert "\t" not in excerpt
    assert len(caret) <= len(excerpt) + 1


def test_line_ends_of_another_system_and_a_mark_at_the_start_do_not_move_the_place(run):
    text = "\ufeffflow: Estuary\r\nwafr: 3\r\nmasks: []\r\n".encode()
    lines = run("check", "-", stdin=text).stderr.splitlines()
    assert lines[:3] == ["<stdin>:2:1: unknown key 'wafr' [FP201]", "    wafr: 3", "    ^"]


def test_warnings_do_not_stop_the_work(run, tmp_path):
    text = "flow: Estuary\ntools: {stepper: {}, spare: {}}\nmasks:\n"
    text += "  - {id: A, tool: stepper, aligns_to: wafer}\n"
    (tmp_path / "odd.yaml").write_text(text)
    result = run("check", "odd.yaml")
    assert result.exit_code == 0
    assert "odd.yaml:2:22: warning: no mask is printed on the tool 'spare' [FP309]" in result.stderr
    assert result.stdout.startswith("Estuary: sound, with 2 warnings\n")
    assert "worst     nothing is judged" in result.stdout


def test_strict_gives_status_1_when_a_pair_fails(run, flow, sound_flow):
    assert run("check", flow).exit_code == 0
    assert run("check", flow, "--strict").exit_code == 1
    assert run("check", sound_flow, "--strict").exit_code == 0


def test_json_carries_the_findings_of_a_faulty_flow(run):
    result = run("check", "-", "--format", "json", stdin="flow: Estuary\nwafr: 3\nmasks: []\n")
    assert result.exit_code == 2
    document = json.loads(result.stdout)
    assert document["sound"] is False
    assert document["summary"] is None
    assert document["findings"][0] == {
        "file": "<stdin>",
        "line": 2,
        "column": 1,
        "severity": "error",
        "code": "FP201",
        "message": "unknown key 'wafr'",
        "hint": "did you mean 'wafer'?",
    }


def test_json_carries_the_summary_of_a_sound_flow(run, flow):
    summary = json.loads(run("check", flow, "--format", "json").stdout)["summary"]
    assert summary["counts"] == {"pass": 1, "tight": 1, "fail": 1, "unjudged": 1}
    assert summary["worst"]["pair"] == "third"


def test_json_and_strict_go_together(run, flow):
    result = run("check", flow, "--format", "json", "--strict")
    assert result.exit_code == 1
    assert json.loads(result.stdout)["sound"] is True


def test_standard_input_is_read_for_a_dash(run, flow):
    text = Path(flow).read_bytes()
    assert run("check", "-", stdin=text).stdout == run("check", flow).stdout


def test_what_is_no_flow_file_gets_one_message(run, tmp_path):
    (tmp_path / "folder").mkdir()
    (tmp_path / "large.yaml").write_bytes(b"#" * 5_000_000)
    (tmp_path / "binary.yaml").write_bytes(bytes(range(256)))
    (tmp_path / "latin.yaml").write_bytes("flow: \xb5m".encode("latin-1"))
    (tmp_path / "empty.yaml").write_bytes(b"")
    for name, told in [
        ("missing.yaml", "missing.yaml:1:1: no such file [FP101]"),
        ("folder", "folder:1:1: is a folder, not a flow file [FP101]"),
        ("large.yaml", "large.yaml:1:1: larger than 4 MB, which no flow file needs [FP103]"),
        ("binary.yaml", "binary.yaml:1:1: not text: it holds zero bytes [FP102]"),
        ("latin.yaml", "latin.yaml:1:7: not UTF-8 text: the byte B5 (hexadecimal) [FP102]"),
        ("empty.yaml", "empty.yaml:1:1: the file is empty [FP108]"),
        ("", "flowplan: no flow file is named [FP602]"),
    ]:
        result = run("check", name)
        assert (result.exit_code, result.stderr.splitlines()[0]) == (2, told)
        assert "\x00" not in result.stderr


def test_control_characters_of_a_flow_never_reach_the_terminal(run, tmp_path, flow):
    text = (
        (tmp_path / flow)
        .read_text()
        .replace("Estuary", '"Estuary \\e[31m"#')
        .replace("third", '"\\e]0;x\\a"')
    )
    result = run("check", "-", stdin=text)
    assert result.stdout.startswith("Estuary \\x1b[31m, revision A: sound\n")
    assert "worst     \\x1b]0;x\\x07 along x" in result.stdout
    assert "\x1b" not in run("margins", "-", stdin=text).stdout


def test_control_characters_of_a_faulty_flow_never_reach_the_terminal(run):
    result = run("check", "-", stdin='flow: Estuary\nmasks: [{"\\e[31m": 1}]\n"wafr\\a": 2\n')
    assert result.exit_code == 2
    assert "unknown key 'wafr\\x07'" in result.stderr
    assert "\x1b" not in result.stderr
    assert "\x07" not in result.stderr


def test_check_starts_without_the_heavy_parts(tmp_path, flow):
    program = (
        "import sys\n"
        "from flowplan.cli.main import app\n"
        "try: app(['check', sys.argv[1]], prog_name='flowplan')\n"
        "except SystemExit as end: assert end.code == 0\n"
        "loaded = {m.partition('.')[0] for m in sys.modules}\n"
        "heavy = {'scipy', 'graphviz', 'pygraphviz', 'jinja2', 'rich', 'polars'} & loaded\n"
        "sys.exit(f'imported {heavy}' if heavy else 0)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, str(tmp_path / flow)], capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert "sound" in done.stdout

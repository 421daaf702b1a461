"""What holds for the command line as a whole: help, status, streams, faults."""

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

import flowplan
from tests.cli.terminal import FLOWPLAN, on_a_terminal

COMMANDS = [
    *("check", "margins", "chain", "tree", "report"),
    *("compare", "remedies", "levers", "propose"),
    *("simulate", "measured"),
    *("new", "schema"),
]
STYLE = re.compile(r"\x1b\[[0-9;]*m")


def test_flowplan_alone_says_what_to_do_next(run):
    result = run()
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert [line.split()[:2] for line in lines] == [
        ["flowplan", "new"], ["flowplan", "check"], ["flowplan", "report"],
    ]  # fmt: skip


def test_the_version_is_printed(run):
    assert run("--version").stdout == f"flowplan {flowplan.__version__}\n"


@pytest.mark.parametrize("command", COMMANDS)
def test_every_help_shows_an_example_within_80_columns(run, command):
    result = run(command, "--help")
    assert result.exit_code == 0
    assert f"Example: flowplan {command}" in result.stdout
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_the_main_help_names_every_command(run):
    text = run("--help").stdout
    assert "Example: " in text
    listed = re.findall(r"^  (\w+)  ", text.partition("Commands:")[2], re.MULTILINE)
    assert listed == COMMANDS


def test_an_unknown_command_is_at_fault(run):
    assert run("chek").exit_code == 2


@pytest.mark.parametrize("command", ["check", "margins", "tree", "report"])
def test_a_faulty_flow_gives_status_2_to_every_command(run, command):
    Path("bad.yaml").write_text("flow: [\n")
    result = run(command, "bad.yaml")
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr.startswith("bad.yaml:1:8: ")


def test_an_unforeseen_fault_is_one_line_that_names_the_way_to_see_more(run, flow, monkeypatch):
    def breaks(*_args):
        raise KeyError("lost")

    monkeypatch.setattr("flowplan.cli.check.analyse", breaks)
    result = run("check", flow)
    assert result.exit_code == 2
    assert result.stderr == (
        "flowplan: unforeseen fault: KeyError: 'lost' (set FLOWPLAN_DEBUG=1 to see where)\n"
    )
    monkeypatch.setenv("FLOWPLAN_DEBUG", "1")
    assert isinstance(run("check", flow).exception, KeyError)


def test_a_reader_that_goes_away_is_no_fault(tmp_path, flow):
    command = f"{sys.executable} -m flowplan margins {flow} --every-pair --format json | head -n 1"
    shell = ["bash", "-c", f"set -o pipefail; {command}"]
    done = subprocess.run(shell, cwd=tmp_path, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stdout, done.stderr) == (0, "{\n", "")


@pytest.mark.parametrize(
    "command", [["margins"], ["margins", "--format", "json"], ["check"], ["tree"]], ids=" ".join
)
def test_a_closed_pipe_is_quiet_at_once(tmp_path, flow, command):
    reading, writing = os.pipe()
    os.close(reading)
    done = subprocess.run(
        [*FLOWPLAN, command[0], flow, *command[1:]],
        cwd=tmp_path, stdout=writing, stderr=subprocess.PIPE, text=True, check=False,
    )  # fmt: skip
    os.close(writing)
    assert (done.returncode, done.stderr) == (0, "")


def test_a_full_disk_is_told(tmp_path, flow):
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [*FLOWPLAN, "margins", flow],
            cwd=tmp_path,
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert done.returncode == 2
    assert done.stderr == "flowplan: cannot write <stdout>: No space left on device [FP501]\n"


def test_a_pipe_gets_neither_colour_nor_box_signs(run, flow):
    for command in (["margins", flow], ["chain", flow, "B", "D"], ["check", flow]):
        text = run(*command).stdout
        assert "\x1b" not in text
        assert not re.search("[\u2500-\u257f]", text)


def test_output_that_is_not_utf8_gets_plain_signs(tmp_path, flow):
    for command in (["tree", flow], ["chain", flow, "B", "D"]):
        done = subprocess.run(
            [*FLOWPLAN, *command], cwd=tmp_path, capture_output=True, check=True,
            env={**os.environ, "PYTHONIOENCODING": "ascii"},
        )  # fmt: skip
        text = done.stdout.decode("ascii")
        assert "\\u" not in text
        assert ("|- B" if command[0] == "tree" else "+/- 52") in text


def test_json_stays_json_where_output_is_not_utf8(tmp_path, flow):
    text = (tmp_path / flow).read_text().replace("third", '"µ → 𝛔"')
    (tmp_path / "signs.yaml").write_text(text)
    done = subprocess.run(
        [*FLOWPLAN, "margins", "signs.yaml", "--format", "json"],
        cwd=tmp_path, capture_output=True, check=True,
        env={**os.environ, "PYTHONIOENCODING": "ascii"},
    )  # fmt: skip
    assert json.loads(done.stdout)["margins"][2]["pair"] == "µ → 𝛔"


def test_a_terminal_of_80_columns_is_never_overrun(tmp_path, flow):
    text = (tmp_path / flow).read_text().replace("third", "a name that is " + "very " * 12 + "long")
    (tmp_path / "long.yaml").write_text(text)
    shown = on_a_terminal(*FLOWPLAN, "margins", "long.yaml", cwd=tmp_path)
    table = STYLE.sub("", shown).split("\n\n")[1].splitlines()
    assert len(table) > 5
    assert max(map(len, table)) <= 80
    assert table[0].split()[-3:] == ["need", "margin", "verdict"]


def test_a_terminal_sees_verdicts_in_colour_and_in_words(tmp_path, flow):
    shown = on_a_terminal(*FLOWPLAN, "margins", flow, cwd=tmp_path)
    assert "\x1b[1;31mfail" in shown
    plain = on_a_terminal(*FLOWPLAN, "margins", flow, cwd=tmp_path, NO_COLOR="1")
    assert not re.search("\x1b\\[[0-9;]*3[0-7]m", plain)
    assert "fail" in plain


def test_a_warning_on_a_terminal_is_in_colour(tmp_path, flow):
    text = (tmp_path / flow).read_text().replace("tools:", "tools:\n  spare: {}")
    (tmp_path / "spare.yaml").write_text(text)
    assert "\x1b[33mwarning: " in on_a_terminal(*FLOWPLAN, "check", "spare.yaml", cwd=tmp_path)


@pytest.mark.parametrize(
    ("closed", "status", "told"),
    [
        ("check - <&-", 2, "<stdin>:1:1: standard input is closed [FP101]"),
        ("check four.yaml >&-", 2, "flowplan: standard output is closed [FP501]"),
        ("check four.yaml --format json >&-", 2, "flowplan: standard output is closed [FP501]"),
        ("check none.yaml 2>&-", 2, ""),
    ],
)
def test_a_closed_stream_is_told_where_it_can_be(tmp_path, flow, closed, status, told):
    shell = f"{sys.executable} -m flowplan {closed}"
    done = subprocess.run(["bash", "-c", shell], cwd=tmp_path, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stdout) == (status, "")
    assert (done.stderr.splitlines() or [""])[0] == told


def test_a_shell_may_hand_over_the_flow_through_a_pipe(tmp_path, flow):
    shell = f"{sys.executable} -m flowplan check <(cat {flow})"
    done = subprocess.run(["bash", "-c", shell], cwd=tmp_path, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    assert ": sound\n" in done.stdout


@pytest.mark.parametrize("output", ["none/out.svg", "folder.svg", "four.svg/out.svg"])
@pytest.mark.parametrize(("command", "reader"), [("report", "open_flow"), ("tree", "read_flow")])
def test_an_output_that_cannot_be_written_is_told_before_the_work(
    run, flow, monkeypatch, command, reader, output
):
    def work(*_args, **_kwargs):
        raise AssertionError("the flow was read first")

    monkeypatch.setattr(f"flowplan.cli.{command}.{reader}", work)
    Path("folder.svg").mkdir()
    Path("four.svg").write_text("a file")
    result = run(command, flow, "-o", output)
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr.startswith(f"flowplan: cannot write '{output}': ")
    assert "hint: name a file in a folder that exists and can be written" in result.stderr

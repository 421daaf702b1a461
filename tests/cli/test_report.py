"""``flowplan report`` writes one HTML page and says how the flow stands."""

import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.terminal import FLOWPLAN, on_a_terminal


def test_it_says_where_it_wrote_and_how_the_flow_stands(run, flow):
    result = run("report", flow, "-o", "out.html")
    assert (result.exit_code, result.stdout) == (0, "")
    assert result.stderr.splitlines() == [
        "wrote out.html",
        "1 pass, 1 tight, 1 fail, 1 unjudged",
        "worst: third along x, margin -1.96 nm, fail",
    ]
    page = Path("out.html").read_text(encoding="utf-8")
    assert page.lower().startswith("<!doctype html>")
    assert "Estuary four masks" in page


def test_without_a_name_it_takes_the_flows_in_the_current_folder(run, tmp_path, flow):
    (tmp_path / "deep").mkdir()
    Path(flow).rename("deep/four.yaml")
    assert run("report", "deep/four.yaml").exit_code == 0
    assert Path("four.html").is_file()
    assert not Path("deep/four.html").exists()


def test_a_flow_from_standard_input_becomes_flow_html(run, flow):
    assert run("report", "-", stdin=Path(flow).read_bytes()).exit_code == 0
    assert Path("flow.html").is_file()


def test_strict_writes_the_report_all_the_same(run, flow, sound_flow):
    assert run("report", flow, "-o", "out.html", "--strict").exit_code == 1
    assert Path("out.html").is_file()
    assert run("report", sound_flow, "--strict").exit_code == 0


@pytest.mark.parametrize("link", [None, "symbolic", "hard"])
def test_the_flow_file_is_never_overwritten_by_whatever_name(run, flow, link):
    text = Path(flow).read_text()
    target = Path("other.html")
    if link == "symbolic":
        target.symlink_to(flow)
    elif link == "hard":
        target.hardlink_to(flow)
    else:
        target = Path("..") / Path.cwd().name / flow
    result = run("report", flow, "-o", target)
    assert result.exit_code == 2
    assert "is the flow file itself [FP501]" in result.stderr
    assert Path(flow).read_text() == text


def test_a_flow_called_html_is_safe_from_its_own_report(run, flow):
    Path(flow).rename("four.html")
    assert run("report", "four.html").exit_code == 2
    assert Path("four.html").read_text().startswith("flow: Estuary four masks")


def test_a_failure_leaves_the_old_report_whole(run, flow, monkeypatch):
    Path("four.html").write_text("old")

    def breaks(*_args, **_more):
        raise RuntimeError("no page")

    monkeypatch.setattr("flowplan.report.page.render_report", breaks)
    assert run("report", flow).exit_code == 2
    assert Path("four.html").read_text() == "old"


def test_a_faulty_flow_leaves_the_old_report_whole(run):
    Path("bad.yaml").write_text("flow: [")
    Path("bad.html").write_text("old")
    assert run("report", "bad.yaml").exit_code == 2
    assert Path("bad.html").read_text() == "old"


def test_a_folder_that_does_not_exist_is_told(run, flow):
    result = run("report", flow, "-o", "nowhere/out.html")
    assert result.exit_code == 2
    assert "cannot write 'nowhere/out.html'" in result.stderr


def test_an_output_without_permission_is_told_and_leaves_nothing(run, flow, monkeypatch):
    def refuses(**_more):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("flowplan.files.writer.tempfile.mkstemp", refuses)
    result = run("report", flow, "-o", "out.html")
    assert result.exit_code == 2
    assert "cannot write 'out.html': Permission denied [FP501]" in result.stderr
    assert not Path("out.html").exists()


def test_no_progress_is_drawn_in_a_pipe(tmp_path, flow):
    done = subprocess.run(
        [sys.executable, "-c", SLOW, flow], cwd=tmp_path, capture_output=True, text=True, check=True
    )
    assert "margins" not in done.stderr.partition("wrote")[0]
    assert "\x1b" not in done.stderr


def test_progress_is_drawn_on_a_terminal_when_it_takes_long(tmp_path, flow):
    shown = on_a_terminal(sys.executable, "-c", SLOW, flow, cwd=tmp_path)
    assert "100%" in shown
    assert shown.index("margins") < shown.index("wrote four.html")
    quick = on_a_terminal(*FLOWPLAN, "check", flow, cwd=tmp_path)
    assert "100%" not in quick


#: The command line with a clock by which every step takes long.
SLOW = """
import sys
from flowplan.cli import progress
progress._MOMENT = -1.0
from flowplan.cli.main import app
app(["report", sys.argv[1]], prog_name="flowplan")
"""

"""Results are written whole or not at all, and only where the name leads."""

import os
import stat
from pathlib import Path

import pytest

from flowplan.errors import OutputError
from flowplan.files.writer import refuse_unwritable, write_atomically


def test_a_failure_leaves_the_old_file_whole_and_nothing_beside_it(tmp_path, monkeypatch):
    old = tmp_path / "report.html"
    old.write_text("old")

    def full(_handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("flowplan.files.writer.os.fsync", full)
    with pytest.raises(OutputError, match="No space left on device"):
        write_atomically(old, "new")
    assert old.read_text() == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["report.html"]


def test_permissions_of_the_old_file_stay(tmp_path):
    old = tmp_path / "report.html"
    old.write_text("old")
    old.chmod(0o640)
    write_atomically(old, "new")
    assert (old.read_text(), stat.S_IMODE(old.stat().st_mode)) == ("new", 0o640)


def test_a_link_is_followed(tmp_path):
    (tmp_path / "real.html").write_text("old")
    link = tmp_path / "link.html"
    link.symlink_to("real.html")
    write_atomically(link, "new")
    assert link.is_symlink()
    assert (tmp_path / "real.html").read_text() == "new"


def test_a_device_is_written_to_and_never_replaced():
    write_atomically(os.devnull, "new")
    assert stat.S_ISCHR(Path(os.devnull).stat().st_mode)


@pytest.mark.parametrize("name", ["", "folder", "missing/report.html", "a\0b", "x" * 300])
def test_a_name_that_cannot_be_written_is_one_finding(tmp_path, monkeypatch, name):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "folder").mkdir()
    with pytest.raises(OutputError) as caught:
        write_atomically(name, "new")
    assert [d.code for d in caught.value.diagnostics] == ["FP501"]
    with pytest.raises(OutputError) as refused:
        refuse_unwritable(name)
    assert refused.value.diagnostics == caught.value.diagnostics
    assert [p.name for p in tmp_path.iterdir()] == ["folder"]


def test_what_can_be_written_is_not_refused_and_not_touched(tmp_path):
    (tmp_path / "old.html").write_text("old")
    for name in (tmp_path / "new.html", tmp_path / "old.html", os.devnull):
        refuse_unwritable(name)
    assert [(p.name, p.read_text()) for p in tmp_path.iterdir()] == [("old.html", "old")]


def test_a_folder_or_a_device_without_permission_is_refused(tmp_path, monkeypatch):
    monkeypatch.setattr("flowplan.files.writer.os.access", lambda *_args: False)  # nothing stops some users
    for name in (tmp_path / "new.html", os.devnull):
        with pytest.raises(OutputError, match="Permission denied"):
            refuse_unwritable(name)


def test_a_pipe_behind_a_link_is_written_to(tmp_path):
    reading, writing = os.pipe()
    write_atomically(f"/dev/fd/{writing}", "new")
    os.close(writing)
    with os.fdopen(reading) as stream:
        assert stream.read() == "new"

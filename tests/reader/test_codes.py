"""Every code of the registry is described, can be reached, and is told as its sample says."""

import re
from pathlib import Path

import pytest
from typer.testing import CliRunner

import flowplan
from flowplan.cli.main import app
from flowplan.errors import CODES
from tests.reader.samples import SAMPLES


def test_every_code_has_a_sample():
    assert list(SAMPLES) == list(CODES)


@pytest.mark.parametrize("code", SAMPLES)
def test_a_sample_is_told_with_its_code_and_status(code, tmp_path, monkeypatch):
    sample = SAMPLES[code]
    monkeypatch.chdir(tmp_path)
    raw = sample.text.encode() if isinstance(sample.text, str) else sample.text
    Path("f.yaml").write_bytes(raw)
    Path("d.csv").write_text(sample.data, encoding="utf-8")
    result = CliRunner().invoke(app, list(sample.command))
    assert result.stderr.splitlines()[0] == f"{sample.told} [{code}]"
    assert result.exit_code == sample.status
    assert "    hint: " in result.stderr


def test_only_warnings_leave_the_status_at_0():
    assert [code for code, sample in SAMPLES.items() if "warning: " in sample.told] == [
        code for code, sample in SAMPLES.items() if sample.status == 0
    ]


def test_the_program_uses_the_codes_of_the_registry_and_no_others():
    package = Path(flowplan.__file__).parent
    sources = {f: f.read_text(encoding="utf-8") for f in package.rglob("*.py") if f.name != "errors.py"}
    used = {code for text in sources.values() for code in re.findall(r"\bFP\d{3}\b", text)}
    assert used == set(CODES)

"""Running flowplan in process, and a small flow with every verdict."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from typer.testing import CliRunner

from flowplan.cli.main import app

#: Each reading of marks adds 30 nm, so n readings between two layers come to 30 * sqrt(n) nm.
FOUR_MASKS = """\
flow: Estuary four masks
revision: A
unit: nm
reserve: 10 %
tools:
  stepper: {alignment: 30, wafer_alignment: 900}
masks:
  - {id: A, tool: stepper, aligns_to: wafer}
  - {id: B, tool: stepper, aligns_to: A}
  - {id: C, tool: stepper, aligns_to: A}
  - {id: D, tool: stepper, aligns_to: C}
pairs:
  - {name: first, rule: overlay, between: [A, B], limit: 100, axes: x}
  - {name: second, rule: overlay, between: [B, C], limit: 45, axes: x}
  - {name: third, rule: overlay, between: [B, D], limit: 50, axes: x}
  - {name: fourth, rule: overlay, between: [A, D], axes: x}
"""

Run = Callable[..., Any]


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run a command line in an empty folder; gives `exit_code`, `stdout` and `stderr`."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("FLOWPLAN_DEBUG", raising=False)

    def command(*arguments: str, stdin: str | bytes | None = None) -> Any:
        return CliRunner().invoke(app, [str(a) for a in arguments], input=stdin, prog_name="flowplan")

    return command


@pytest.fixture
def flow(tmp_path: Path) -> str:
    """The four masks as a file in the current folder."""
    (tmp_path / "four.yaml").write_text(FOUR_MASKS, encoding="utf-8")
    return "four.yaml"


@pytest.fixture
def sound_flow(tmp_path: Path) -> str:
    """The four masks without the pair that fails."""
    lines = [line for line in FOUR_MASKS.splitlines() if "third" not in line]
    (tmp_path / "sound.yaml").write_text("\n".join(lines) + "\n", encoding="utf-8")
    return "sound.yaml"

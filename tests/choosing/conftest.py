"""The command line in process, for plans that differ."""

from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

import pytest
from typer.testing import CliRunner

from flowplan.cli.main import app


@dataclass(frozen=True)
class Ended:
    """How a command ended, and what it printed."""

    status: int
    out: str
    err: str


class Cli(Protocol):
    """A command line, argument by argument."""

    def __call__(self, *arguments: object) -> Ended: ...


@pytest.fixture
def cli(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Cli:
    monkeypatch.chdir(tmp_path)

    def command(*arguments: object) -> Ended:
        found = CliRunner().invoke(app, [str(a) for a in arguments], prog_name="flowplan")
        return Ended(found.exit_code, found.stdout, found.stderr)

    return command

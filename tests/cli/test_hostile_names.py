"""Long names and control characters in a flow neither overrun a line nor reach the terminal."""

import json
import re
from pathlib import Path

import pytest

from tests.cli.terminal import FLOWPLAN, on_a_terminal

COMMANDS = [
    ["check"], ["margins"], ["tree"], ["chain", "B", "D"], ["margins", "--every-pair"],
    ["margins", "--format", "csv"], ["margins", "--format", "json"], ["margins", "--format", "markdown"],
    ["check", "--format", "json"], ["chain", "B", "D", "--format", "json"],
]  # fmt: skip
FOR_PEOPLE = [command for command in COMMANDS if "--format" not in command]
ids = [" ".join(command) for command in COMMANDS]

#: An escape sequence, a C1 control, a bell, text running backwards, a line separator.
CONTROLS = "\x1b[31m\x9b5m\x07\u202e\u2028"
LONG = "a_name_without_a_space_" * 6


def command_line(command: list[str], file: str, ids: dict[str, str] | None = None) -> list[str]:
    return [command[0], file, *((ids or {}).get(word, word) for word in command[1:])]


@pytest.fixture
def hostile(tmp_path: Path, flow: str) -> str:
    """The four masks with control characters wherever a flow takes free text."""
    written = json.dumps(CONTROLS)
    text = (tmp_path / flow).read_text()
    text = text.replace("flow: Estuary four masks", f"flow: {written}").replace(
        "revision: A", f"revision: {written}"
    )
    text = text.replace("name: third", f"name: {written}")
    text = text.replace("id: D,", f"id: D, title: {written}, terms: {{{written}: 40}},")
    (tmp_path / "hostile.yaml").write_text(text)
    return "hostile.yaml"


@pytest.fixture
def long(tmp_path: Path, flow: str) -> str:
    """The four masks with names longer than a line."""
    text = (tmp_path / flow).read_text()
    text = text.replace("Estuary four masks", "Estuary " + "four very long masks " * 10)
    text = text.replace("revision: A", f"revision: {LONG}").replace("name: third", f"name: {LONG}")
    text = re.sub(r"\b([BCD])\b", lambda found: f"{found.group()}_{LONG}", text)
    text = text.replace("aligns_to: A}", f"aligns_to: A, terms: {{{LONG} {LONG}: 40}}}}")
    (tmp_path / "long.yaml").write_text(text)
    return "long.yaml"


@pytest.mark.parametrize("command", COMMANDS, ids=ids)
def test_no_control_character_is_printed(run, hostile, command):
    result = run(*command_line(command, hostile))
    assert (result.exit_code, result.stderr) == (0, "")
    assert [c for c in result.stdout if not (c.isprintable() or c == "\n")] == []


def test_json_still_carries_the_very_name(run, hostile):
    entries = json.loads(run("margins", hostile, "--format", "json").stdout)["margins"]
    assert CONTROLS in {entry["pair"] for entry in entries}


def test_nor_does_a_terminal_see_one(tmp_path, hostile):
    for command in (["check"], ["margins"], ["tree"], ["chain", "B", "D"]):
        shown = on_a_terminal(*FLOWPLAN, *command_line(command, hostile), cwd=tmp_path)
        plain = re.sub(r"\x1b\[(0|1|2|1;31|33|32)m", "", shown)  # the styles of flowplan's own
        assert [c for c in plain if not (c.isprintable() or c == "\n")] == []


@pytest.mark.parametrize("command", FOR_PEOPLE, ids=[" ".join(c) for c in FOR_PEOPLE])
def test_long_names_stay_within_80_columns(run, long, command):
    ids = {letter: f"{letter}_{LONG}" for letter in "BD"}
    result = run(*command_line(command, long, ids))
    assert (result.exit_code, result.stderr) == (0, "")
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_a_message_quotes_no_more_than_a_line_of_a_long_name(run, long):
    Path(long).write_text(Path(long).read_text().replace("tool: stepper", f"tool: {LONG * 3}"))
    lines = run("check", long).stderr.splitlines()
    assert any("unknown tool 'a_name_without_a_space_" in line for line in lines)
    assert max(map(len, lines)) <= 120

"""A small flow, of which each case replaces one line, and how cases are written down.

A case is three kinds of lines and ends with an empty one::

    2: tools: {s: {alignment: -30}}          the line of the flow that is replaced, and by what
     : a line that follows it, where there is one
    FP206 2:24 -30 is negative               code, place and message
    hint: a size is 0 or more                what to do about it

``␉`` stands for a tab.
"""

from dataclasses import dataclass

import pytest

from flowplan.errors import Diagnostic, FlowError
from flowplan.files.reader import parse

FLOW = """\
flow: Estuary
tools: {s: {alignment: 30, wafer_alignment: 900}}
masks:
  - {id: A, tool: s, aligns_to: wafer}
  - {id: B, tool: s, aligns_to: A}
pairs: [{rule: overlay, between: [A, B], limit: 90}]
"""


@dataclass(frozen=True)
class Case:
    """One faulty flow and its findings."""

    text: str
    expected: tuple[str, ...]


def read_cases(written: str) -> list:
    """Return the cases of a block of text, named by the line that is replaced."""
    return [
        pytest.param(_case(block), id=block.partition("\n")[0][:60])
        for block in written.strip("\n").split("\n\n")
    ]


def _case(block: str) -> Case:
    lines = FLOW.splitlines()
    rows = block.split("\n")
    number, _, first = rows.pop(0).partition(": ")
    replacement = [first]
    while rows[0].startswith(" : "):
        replacement.append(rows.pop(0)[3:])
    lines[int(number) - 1 : int(number)] = [line.replace("␉", "\t") for line in replacement]
    return Case("\n".join(lines) + "\n", tuple(rows))


def findings(text: str) -> tuple[Diagnostic, ...]:
    """Return what the reader finds in a text, warnings of a sound flow included."""
    try:
        return parse(text, "f.yaml").warnings
    except FlowError as error:
        return error.diagnostics


def told(text: str) -> tuple[str, ...]:
    """Return the findings as cases write them."""
    lines: list[str] = []
    for found in findings(text):
        assert found.span is not None
        lines.append(f"{found.code} {found.span.line}:{found.span.column} {found.message}")
        if found.hint:
            lines.append(f"hint: {found.hint}")
    return tuple(lines)

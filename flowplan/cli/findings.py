"""Findings on the screen: place, message, the source line with a caret, and a hint."""

import re
import sys
from collections.abc import Iterable
from typing import Any

import typer

from flowplan.cli.streams import has_colour, printable, tell
from flowplan.errors import Diagnostic, Span

_LINE_END = re.compile(r"\r\n|[\n\r\x85\u2028\u2029]")
_WIDTH = 74
_BEFORE = 60
#: A longer list helps nobody; mending these shows the next.
_MOST_SHOWN = 200
#: What stands in the file more often than this is one mistake, shown once.
_MOST_ALIKE = 3
_MOST_LINES = 8


def show_findings(findings: Iterable[Diagnostic], source: str | None = None) -> None:
    """Print findings on standard error.

    Parameters
    ----------
    findings : iterable of Diagnostic
        In the order in which they are shown.
    source : str, optional
        The text that their places refer to.
    """
    lines = _LINE_END.split(source) if source is not None else []
    coloured = has_colour(sys.stderr)
    found = tuple(_folded(findings))
    for finding, elsewhere in found[:_MOST_SHOWN]:
        shown = _finding_lines(finding, lines, coloured=coloured)
        tell("\n".join(shown + ([_elsewhere(elsewhere)] if elsewhere else [])))
    hidden = sum(1 + len(elsewhere) for _, elsewhere in found[_MOST_SHOWN:])
    if hidden:
        tell(f"… and {hidden} more")


def _folded(findings: Iterable[Diagnostic]) -> list[tuple[Diagnostic, list[Diagnostic]]]:
    """Return each finding to show; one that comes often only once, with the other places."""
    found = tuple(findings)
    groups: dict[tuple[str, str], list[Diagnostic]] = {}
    for finding in found:
        groups.setdefault((finding.code, finding.message), []).append(finding)
    shown: list[tuple[Diagnostic, list[Diagnostic]]] = []
    for finding in found:
        first, *others = groups[finding.code, finding.message]
        if len(others) < _MOST_ALIKE:
            shown.append((finding, []))
        elif finding is first:
            shown.append((finding, others))
    return shown


def _elsewhere(findings: list[Diagnostic]) -> str:
    lines = list(dict.fromkeys(str(f.span.line) for f in findings if f.span))
    named = ", ".join(lines[:_MOST_LINES]) + (", …" if len(lines) > _MOST_LINES else "")
    return f"    the same in {len(findings)} more places, line{'' if len(lines) == 1 else 's'} {named}"


def count_findings(findings: Iterable[Diagnostic]) -> str:
    """Return ``2 errors, 1 warning``; empty when there is none."""
    severities = [f.severity for f in findings]
    counted = [(severities.count(word), word) for word in ("error", "warning")]
    return ", ".join(f"{n} {word}{'s' if n != 1 else ''}" for n, word in counted if n)


def finding_record(finding: Diagnostic) -> dict[str, Any]:
    """Return a finding as a JSON-ready record."""
    span = finding.span
    return {
        "file": span.file if span else None,
        "line": span.line if span else None,
        "column": span.column if span else None,
        "severity": finding.severity,
        "code": finding.code,
        "message": finding.message,
        "hint": finding.hint or None,
    }


def _finding_lines(finding: Diagnostic, lines: list[str], *, coloured: bool) -> list[str]:
    def paint(text: str, **style: Any) -> str:
        return typer.style(text, **style) if coloured and text else text

    place = f"{finding.span}: " if finding.span else "flowplan: "
    word = "warning: " if finding.severity == "warning" else ""
    tint = "yellow" if word else "red"
    head = paint(printable(place), bold=True) + paint(word, fg=tint) + printable(finding.message)
    shown = [f"{head} {paint(f'[{finding.code}]', fg=tint)}"]
    if finding.span and finding.span.line <= len(lines) and _is_text(lines[finding.span.line - 1]):
        text, caret = _excerpt(lines[finding.span.line - 1], finding.span)
        shown += [f"    {text}", "    " + paint(caret, fg=tint)]
    if finding.hint:
        shown.append(f"    hint: {printable(finding.hint)}")
    return shown


def _is_text(line: str) -> bool:
    """Whether a line is worth showing: something in it, and no control characters."""
    return bool(line.strip()) and all(c.isprintable() or c == "\t" for c in line)


def _excerpt(line: str, span: Span) -> tuple[str, str]:
    """Return the part of a line around a place, and the caret that points at it."""
    at = min(span.column - 1, len(line))
    start = max(0, at - _BEFORE) if len(line) > _WIDTH else len(line) - len(line.lstrip())
    start = min(start, at)
    cut = line[start : start + _WIDTH]
    lead = "…" if start and line[:start].strip() else ""
    tail = "…" if start + _WIDTH < len(line) else ""
    before = lead + printable(line[start:at])
    return lead + printable(cut) + tail, " " * len(before) + "^"

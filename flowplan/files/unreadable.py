"""What is wrong with a row that cannot be read: the line itself says it best."""

import math
from collections.abc import Sequence
from itertools import islice
from pathlib import Path

from flowplan.errors import Diagnostic, Span, in_brief
from flowplan.files.headings import MOST, NUMBERS
from flowplan.files.measuredrows import LINES_BEFORE, Layout

_HINT = "mend the row, or leave it out"


def explain_lines(file: str, layout: Layout | None, rows: Sequence[int]) -> tuple[Diagnostic, ...]:
    """Return a warning for each row that cannot be read.

    Parameters
    ----------
    file : str
        The file.
    layout : Layout or None
        How the CSV is written; None for Parquet, whose rows have no lines.
    rows : sequence of int
        The rows from 0, in order.
    """
    if layout is None:
        message = "row {} cannot be read: a value is missing, or no finite number"
        return tuple(
            Diagnostic(
                "FP703", message.format(row + 1), _HINT, span=Span(file, row + 1, 1), severity="warning"
            )
            for row in rows
        )
    lines = _lines(file, [row + LINES_BEFORE for row in rows])
    return tuple(in_brief(_finding(Span(file, number + 1, 1), text, layout)) for number, text in lines)


def _lines(file: str, numbers: Sequence[int]) -> list[tuple[int, str]]:
    """Return some lines of a file, numbered from 0, as they stand."""
    wanted = set(numbers)
    with Path(file).open("rb") as stream:
        return [
            (number, raw.decode("utf-8", "replace").rstrip("\r\n"))
            for number, raw in enumerate(islice(stream, max(wanted, default=-1) + 1))
            if number in wanted
        ]


def _finding(place: Span, text: str, layout: Layout) -> Diagnostic:
    fields = [field.strip(' "') for field in text.split(layout.separator)]
    column, message = 1, "this row cannot be read"
    if not text.strip():
        message = "an empty line among the rows"
    elif len(fields) != layout.columns.count:
        inside = ", those inside quotes counted" if '"' in text else ""
        message = f"{len(fields)} fields where the headings are {layout.columns.count}{inside}"
    else:
        for name, at in sorted(layout.columns.place.items(), key=lambda item: item[1]):
            wrong = _wrong(name, fields[at], decimal_comma=layout.decimal_comma)
            if wrong:
                message = wrong
                column = 1 + len(layout.separator.join(text.split(layout.separator)[:at])) + bool(at)
                break
    return Diagnostic("FP703", message, _HINT, span=Span(place.file, place.line, column), severity="warning")


def _wrong(name: str, text: str, *, decimal_comma: bool) -> str:
    if not text:
        return f"{name} is empty"
    if name not in NUMBERS:
        return ""
    try:
        value = float(text.replace(",", ".") if decimal_comma else text)
    except ValueError:
        return f"{name} is not a number: {text!r}"
    if not math.isfinite(value):
        return f"{name} is not a finite number: {text!r}"
    return "" if abs(value) <= MOST else f"{name} is too large for a wafer: {text!r}"

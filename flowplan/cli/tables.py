"""Tables: calm and coloured on a terminal, plain aligned text in a pipe."""

import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

from flowplan.cli.streams import emit, has_colour, printable

_GAP = "  "
#: Colours say what the words already say.
_STYLES = {"fail": "bold red", "tight": "yellow", "pass": "green"}


@dataclass(frozen=True, slots=True)
class Column:
    """A column's heading, its alignment, and whether a terminal may fold its text."""

    name: str
    align: Literal["left", "right"] = "left"
    folds: bool = False


def show_table(columns: Sequence[Column], rows: Iterable[Sequence[str]], indent: int = 0) -> None:
    """Print a table on standard output.

    Parameters
    ----------
    columns : sequence of Column
        A terminal keeps the table within its width by folding the columns that may fold; a pipe
        gets one line a row, whatever its length.
    rows : iterable of sequence of str
        One text a column.
    indent : int
        Spaces before each line.
    """
    cells = [[printable(cell) for cell in row] for row in rows]
    if sys.stdout.isatty():
        _show_rich(columns, cells, indent)
    else:
        _show_plain(columns, cells, indent)


def show_note(text: str, *, strong: bool = False) -> None:
    """Print a line that stands by a table; a terminal shows it quieter, or stronger."""
    text = printable(text)
    if text and has_colour(sys.stdout):
        text = f"\x1b[{1 if strong else 2}m{text}\x1b[0m"
    emit(text)


def markdown_lines(columns: Sequence[Column], rows: Iterable[Sequence[str]]) -> list[str]:
    """Return a table in Markdown."""
    rule = ["---:" if column.align == "right" else "---" for column in columns]
    cells = [[_markdown(cell) for cell in row] for row in rows]
    return ["| " + " | ".join(line) + " |" for line in ([c.name for c in columns], rule, *cells)]


def _markdown(cell: str) -> str:
    text = printable(cell)
    for sign in "\\|<`*_":
        text = text.replace(sign, "\\" + sign)
    return text


def _show_plain(columns: Sequence[Column], rows: list[list[str]], indent: int) -> None:
    lines = [[column.name for column in columns], *rows]
    widths = [max(len(line[i]) for line in lines) for i in range(len(columns))]
    for line in lines:
        padded = [
            cell.rjust(width) if column.align == "right" else cell.ljust(width)
            for cell, width, column in zip(line, widths, columns, strict=True)
        ]
        emit((" " * indent + _GAP.join(padded)).rstrip())


def _show_rich(columns: Sequence[Column], rows: list[list[str]], indent: int) -> None:
    from rich.console import Console
    from rich.padding import Padding
    from rich.table import Table
    from rich.text import Text

    table = Table(box=None, padding=(0, 2, 0, 0), header_style="dim", pad_edge=False)
    for column in columns:
        table.add_column(
            Text(column.name),
            justify=column.align,
            no_wrap=not column.folds,
            overflow="fold",
            ratio=None,
        )
    for row in rows:
        table.add_row(*(Text(cell, style=_STYLES.get(cell, "")) for cell in row))
    console = Console(highlight=False)
    with console.capture() as captured:
        console.print(Padding(table, (0, 0, 0, indent)))
    emit("\n".join(line.rstrip() for line in captured.get().splitlines()))

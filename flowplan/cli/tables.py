"""Tables: calm, coloured on a terminal, plain and always of one width in a pipe."""

import io
import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

from flowplan.cli.streams import emit, folded, has_colour, printable, width
from flowplan.model.flow import Flow
from flowplan.report.landing import left_to_margins

#: Colours say what the words already say.
_STYLES = {"fail": "bold red", "tight": "yellow", "pass": "green"}


@dataclass(frozen=True, slots=True)
class Column:
    """A column's heading and alignment; figures stand right and are never folded."""

    name: str
    align: Literal["left", "right"] = "left"


def show_table(columns: Sequence[Column], rows: Iterable[Sequence[str]], indent: int = 0) -> None:
    """Print a table on standard output, its words folded to fit.

    Parameters
    ----------
    columns : sequence of Column
        A terminal keeps the table within its width, a pipe within 80 columns.
    rows : iterable of sequence of str
        One text a column.
    indent : int
        Spaces before each line.
    """
    from rich.console import Console
    from rich.padding import Padding
    from rich.table import Table
    from rich.text import Text

    coloured = has_colour(sys.stdout)
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="dim", pad_edge=False)
    for column in columns:
        table.add_column(Text(column.name), justify=column.align, no_wrap=column.align == "right")
    for row in rows:
        table.add_row(*(Text(printable(cell), style=_STYLES.get(cell, "")) for cell in row))
    paper = io.StringIO()
    console = Console(
        file=paper, width=width(), force_terminal=coloured, color_system="standard" if coloured else None
    )
    console.print(Padding(table, (0, 0, 0, indent)))
    emit("\n".join(line.rstrip() for line in paper.getvalue().splitlines()))


def show_note(text: str, *, strong: bool = False) -> None:
    """Print a line that stands by a table; a terminal shows it quieter, or stronger."""
    indent = len(text) - len(text.lstrip())
    text = folded(printable(text), indent + 2)
    if text and has_colour(sys.stdout):
        text = f"\x1b[{1 if strong else 2}m{text}\x1b[0m"
    emit(text)


def show_left_out(flow: Flow, instead: str = "") -> None:
    """Print what a command that judges single axes leaves out."""
    if text := left_to_margins(flow):
        show_note(f"{instead}: {text}" if instead else text)


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

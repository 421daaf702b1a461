"""``flowplan tree``: who aligns to whom, as text or as a drawing."""

from pathlib import Path
from typing import get_args

from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.session import read_flow
from flowplan.cli.streams import printable, tell
from flowplan.cli.tables import Column, show_note, show_table
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.base import AXES, Axis
from flowplan.model.flow import Flow
from flowplan.report.texttree import tree_lines


def tree(name: str, variant: str | None, output: str | None, axis: Axis | None) -> None:
    """Print the alignment tree of a flow, or draw it to a file."""
    if output is None:
        _show(read_flow(name, variant), (axis,) if axis else AXES)
        return
    from flowplan.report.layout import Format, draw
    from flowplan.report.tree import alignment_dot

    kinds = {f".{kind}": kind for kind in get_args(Format)}
    kind = kinds.get(Path(output).suffix.lower())
    if kind is None:
        message = f"{output!r} is no kind of drawing that flowplan writes"
        raise UsageError([Diagnostic("FP602", message, "end the name in " + ", ".join(kinds))])
    if axis is not None:
        hint = "leave --axis out; the drawing tells the axes apart by line style"
        raise UsageError([Diagnostic("FP602", "a drawing shows both axes", hint)])
    refuse_output(output, name)
    write_output(output, draw(alignment_dot(read_flow(name, variant)), kind), flow=name)
    tell(f"wrote {printable(output)}")


def _show(flow: Flow, axes: tuple[Axis, ...]) -> None:
    show_note(flow.heading, strong=True)
    along = "" if len(axes) > 1 else f", along {axes[0]}"
    show_note(f"each layer stands below the one it aligns to{along}")
    columns = (Column("", "right"), Column("layer"), Column("aligns to"))
    rows = [
        ("" if line.number is None else str(line.number), line.branch + line.name, line.reads)
        for line in tree_lines(flow, axes)
    ]
    show_table(columns, rows)

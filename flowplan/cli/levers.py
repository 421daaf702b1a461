"""``flowplan levers``: what each quoted size is worth."""

from collections.abc import Sequence
from dataclasses import dataclass

from flowplan.cli.options import CompareForm
from flowplan.cli.progress import Bar
from flowplan.cli.session import read_flow
from flowplan.cli.streams import emit, emit_json, printable
from flowplan.cli.tables import Column, markdown_lines, show_left_out, show_note
from flowplan.engine.levers import Levers
from flowplan.engine.levers import levers as work
from flowplan.report.levertext import LEVER_HEADINGS, LeverText, lever_text
from flowplan.report.records_levers import levers_document
from flowplan.report.textfigures import Figures

#: How many columns of a row are words: the path and the axis.
_WORDS = 2


@dataclass(frozen=True, slots=True)
class LeverChoice:
    """Which sizes are shown, and how."""

    paths: tuple[str, ...]
    every: bool
    form: CompareForm


def levers(name: str, variant: str | None, choice: LeverChoice) -> None:
    """Print what each quoted size of a flow is worth."""
    flow = read_flow(name, variant)
    with Bar("sizes") as bar:
        found = work(flow, choice.paths, bar.step)
    if choice.form is CompareForm.JSON:
        emit_json(levers_document(found))
        return
    text = lever_text(found, every=choice.every or bool(choice.paths))
    (_markdown if choice.form is CompareForm.MARKDOWN else _show)(found, text)


def _show(found: Levers, text: LeverText) -> None:
    flow = found.flow
    show_note(flow.heading, strong=True)
    show_note(f"lengths in {flow.unit}, {flow.basis} basis, {flow.confidence:g} sigma; {_state(found)}")
    emit("")
    if text.rows:
        _show_rows(text.rows)
        emit("")
    if text.left_out:
        emit(f"{text.left_out} more sizes are worth nothing by themselves (--all shows them)")
    for line in text.legend if text.rows else ():
        show_note(line)
    show_left_out(found.flow)


def _markdown(found: Levers, text: LeverText) -> None:
    columns = [Column(name, "right" if figure else "left") for name, figure in LEVER_HEADINGS]
    emit("\n".join([_state(found), "", *markdown_lines(columns, text.rows)]))


def _state(found: Levers) -> str:
    if found.worst is None:
        return "nothing is judged"
    figures = Figures.fitting(found.flow.unit, [found.worst])
    return f"worst margin {figures.with_unit(found.worst)}, {found.failing} fail"


def _show_rows(rows: Sequence[Sequence[str]]) -> None:
    """Print each size on a line of its own and its figures below; paths are too long for a column."""
    table = [[name for name, _ in LEVER_HEADINGS], *rows]
    widths = [max(len(row[i]) for row in table) for i in range(_WORDS, len(LEVER_HEADINGS))]
    for number, (path, axis, *figures) in enumerate(table):
        line = "  ".join(f"{text:>{width}}" for text, width in zip(figures, widths, strict=True))
        if number:
            emit(printable(f"{path}, along {axis}" if axis else path))
            emit(f"    {line}".rstrip())
        else:
            show_note(f"    {line}")

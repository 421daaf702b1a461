"""``flowplan remedies``: what to do about each pair that does not pass."""

import textwrap
from dataclasses import dataclass

from flowplan.cli.options import CompareForm
from flowplan.cli.progress import Bar
from flowplan.cli.session import read_flow
from flowplan.cli.streams import emit, emit_json, printable
from flowplan.cli.tables import Column, markdown_lines, show_left_out, show_note, show_table
from flowplan.engine.remedies import remedies as work
from flowplan.engine.remedies.result import Remedies
from flowplan.report.records_remedies import remedies_document
from flowplan.report.remedytext import REMEDY_HEADINGS, REMEDY_LEGEND, CaseText, RemedyWords

_COLUMNS = tuple(Column(name, "right" if figure else "left") for name, figure in REMEDY_HEADINGS)
_WIDTH = 80


@dataclass(frozen=True, slots=True)
class RemedyChoice:
    """Which remedies are shown, and how."""

    pairs: tuple[str, ...]
    every: bool
    each: int
    form: CompareForm


def remedies(name: str, variant: str | None, choice: RemedyChoice) -> None:
    """Print what helps each pair that fails or is tight."""
    flow = read_flow(name, variant)
    with Bar("remedies") as bar:
        found = work(flow, choice.pairs, every=choice.every, progress=bar.step)
    if choice.form is CompareForm.JSON:
        emit_json(remedies_document(found))
        return
    words = RemedyWords(found)
    texts = [words.case(case, choice.each) for case in found.cases]
    (_markdown if choice.form is CompareForm.MARKDOWN else _show)(found, texts)


def _show(found: Remedies, texts: list[CaseText]) -> None:
    flow = found.flow
    show_note(flow.heading, strong=True)
    show_note(f"lengths in {flow.unit}, {flow.basis} basis, {flow.confidence:g} sigma")
    if not texts:
        emit("")
        emit(_NOTHING)
        show_left_out(flow)
        return
    for text in texts:
        emit("")
        show_note(text.title, strong=True)
        show_note(f"chain {text.chain}")
        if text.rows:
            show_table(_COLUMNS, text.rows, indent=2)
            if text.more:
                emit(f"  {text.more} more changes help (--each N shows more)")
            emit(_paragraph(f"For the review: {text.sentences[0]}"))
        else:
            emit("  no single change helps")
    emit("")
    for line in REMEDY_LEGEND:
        show_note(line)
    show_left_out(flow)


def _paragraph(text: str) -> str:
    return textwrap.fill(printable(text), _WIDTH, initial_indent="  ", subsequent_indent="  ")


def _markdown(found: Remedies, texts: list[CaseText]) -> None:
    emit(f"# {printable(found.flow.heading)}: remedies")
    emit("")
    emit(f"Lengths in {found.flow.unit}." if texts else _NOTHING)
    for text in texts:
        emit("\n".join(["", f"## {printable(text.title)}", "", *markdown_lines(_COLUMNS, text.rows), ""]))
        emit("\n".join(f"- {printable(sentence)}" for sentence in text.sentences))


_NOTHING = "every judged pair passes: there is nothing to mend"

"""``flowplan measured``: measured overlay beside the plan, and back into it."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from flowplan.cli.findings import show_findings
from flowplan.cli.options import CompareForm, SignName
from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.progress import Bar
from flowplan.cli.session import STDIN, Opened, open_flow, read_flow
from flowplan.cli.streams import emit, emit_json, printable, tell
from flowplan.cli.tables import Column, markdown_lines, show_note, show_table
from flowplan.engine.analysis import Engine
from flowplan.errors import Diagnostic, UsageError
from flowplan.files.headings import parse_columns
from flowplan.report.measured import MeasuredText, TableText, measured_text
from flowplan.report.measuring import Asked, Taken, take_measurements
from flowplan.report.records_measured import measured_document

_Block = TypeVar("_Block")
_PAGES = (".html", ".htm")


@dataclass(frozen=True, slots=True)
class MeasuredChoice:
    """What is read, how, and what becomes of it."""

    data: str | None
    asked: Asked
    form: CompareForm
    output: str | None


@dataclass(frozen=True, slots=True)
class Making:
    """Synthetic data that are asked for."""

    file: str
    seed: int
    lots: int
    wafers: int


def measured(name: str, variant: str | None, choice: MeasuredChoice) -> None:
    """Print measured overlay beside the plan; write the flow or a page where that is asked for."""
    if choice.data is None:
        hint = "name a CSV or Parquet file, or let --make write one"
        raise UsageError([Diagnostic("FP602", "no measured data are named", hint)])
    _refuse_output_that_cannot_be(name, variant, choice)
    opened = open_flow(name, variant)
    opened.show_warnings()
    with Bar("measured data") as bar:
        taken = take_measurements(opened.flow, choice.data, choice.asked, bar.step)
    warn(taken)
    _print(taken, choice.form)
    if choice.output:
        _write(name, opened, taken, choice.output)


def warn(taken: Taken) -> None:
    """Print what the data leave to be desired on standard error."""
    show_findings(taken.warnings())
    count = taken.data.n_unreadable
    if count:
        tell(f"{count:,} of {taken.data.n_rows:,} rows cannot be read and are left out")


def ask(columns: str | None, sign: SignName, limit: float | None) -> Asked:
    """Return how the data are to be read, as the options say."""
    return Asked(parse_columns(columns) if columns else {}, sign is SignName.REFERENCE, limit)


def make(name: str, variant: str | None, data: str | None, making: Making) -> None:
    """Write synthetic measured data drawn from a flow's own sources."""
    from flowplan.engine.measured.synthetic import readings_of, synthetic
    from flowplan.files.measurementsout import write_measurements

    if data is not None:
        hint = f"leave {data!r} out, and read what --make writes afterwards"
        raise UsageError([Diagnostic("FP602", "--make writes data and reads none", hint)])
    refuse_output(making.file, name)
    flow = read_flow(name, variant)
    readings = readings_of(flow)
    if not readings:
        hint = "let a mask align to another with aligns_to"
        raise UsageError([Diagnostic("FP602", "no mask of the flow reads another", hint)])
    total = making.lots * making.wafers * len(readings)
    with Bar("wafers") as bar:
        blocks = synthetic(Engine.of(flow), making.seed, making.lots, making.wafers)
        rows = write_measurements(making.file, _watched(blocks, bar, total), flow.unit)
    tell(f"wrote {printable(making.file)}: {rows:,} rows, {len(readings)} readings, seed {making.seed}")


def _watched(blocks: Iterable[_Block], bar: Bar, total: int) -> Iterator[_Block]:
    for done, block in enumerate(blocks):
        bar.step(done, total)
        yield block


def _refuse_output_that_cannot_be(name: str, variant: str | None, choice: MeasuredChoice) -> None:
    if not choice.output:
        return
    refuse_output(choice.output, name)
    if choice.data is not None:
        _refuse_data_as_output(choice.output, choice.data)
    if variant is not None and not _is_page(choice.output):
        message = "-o writes the file's own plan with measured sizes, not a variant's"
        hint = "leave -o out, and change the variant by hand"
        raise UsageError([Diagnostic("FP602", message, hint)])


def _refuse_data_as_output(output: str, data: str) -> None:
    if Path(output).exists() and Path(data).exists() and Path(output).samefile(data):
        raise UsageError(
            [Diagnostic("FP602", f"{output!r} is the measured data", "name another file with -o")]
        )


def _is_page(output: str) -> bool:
    return output.lower().endswith(_PAGES)


def _print(taken: Taken, form: CompareForm) -> None:
    if form is CompareForm.JSON:
        emit_json(measured_document(taken))
        return
    text = measured_text(taken)
    (_markdown if form is CompareForm.MARKDOWN else _show)(text)


def _show(text: MeasuredText) -> None:
    show_note(text.heading, strong=True)
    show_note(f"{text.counts}; lengths in {text.unit}")
    for table in text.tables:
        emit("")
        show_note(table.title, strong=True)
        show_table(_columns(table), table.rows)
        show_note(" ".join(table.legend))
    for title, lines in (("Outliers", text.outliers), ("Nothing about alignment", text.silent)):
        if lines:
            emit("")
            show_note(title, strong=True)
            for line in lines:
                show_note(line)


def _columns(table: TableText) -> list[Column]:
    return [Column(name, "right" if figure else "left") for name, figure in table.headings]


def _markdown(text: MeasuredText) -> None:
    emit(f"# {printable(text.heading)}: measured overlay")
    emit("")
    emit(f"{text.counts}. Lengths in {text.unit}.")
    for table in text.tables:
        emit("\n".join(["", f"## {table.title}", "", *markdown_lines(_columns(table), table.rows)]))
        emit("\n" + " ".join(table.legend))
    for title, lines in (("Outliers", text.outliers), ("Nothing about alignment", text.silent)):
        if lines:
            emit("\n".join(["", f"## {title}", "", *(f"- {printable(line)}" for line in lines)]))


def _write(name: str, opened: Opened, taken: Taken, output: str) -> None:
    if _is_page(output):
        from flowplan.report.page import render_measured

        write_output(output, render_measured(taken), flow=name)
        tell(f"wrote {printable(output)}")
        return
    from flowplan.files.alignments import write_alignments

    choices = taken.sizes.choices()
    if not choices:
        tell("these data say nothing about an alignment: nothing is written")
        return
    shown = "<stdin>" if name == STDIN else name
    origins = taken.sizes.origins(taken.measured, Path(taken.data.source.file).name)
    written = write_alignments(opened.text, opened.flow, choices, origins, shown)
    write_output(output, written, flow=name)
    tell(f"wrote {printable(output)}: {len(choices)} measured alignments")

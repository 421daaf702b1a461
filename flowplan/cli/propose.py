"""``flowplan propose``: the best references for every mask that may choose."""

import signal
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from types import FrameType
from typing import Any

import typer

from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.progress import Bar
from flowplan.cli.session import STDIN, Opened, open_flow
from flowplan.cli.status import Status
from flowplan.cli.streams import emit, emit_json, tell
from flowplan.cli.tables import Column, markdown_lines, show_left_out, show_note, show_table
from flowplan.engine.propose import Goal, Ladder, Progress, Proposal, ladder, propose
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.flow import Flow
from flowplan.report.proposal import (
    LadderText,
    ProposalText,
    ladder_document,
    ladder_text,
    proposal_document,
    proposal_text,
)
from flowplan.report.textfigures import Figures, percent

#: Processes that search at once: one for each axis.
_WORKERS = 2


@dataclass(frozen=True, slots=True)
class Wish:
    """What the plan should reach and what it may change."""

    goal: Goal
    free: tuple[str, ...]
    free_all: bool
    pin: tuple[str, ...]
    same_reference: bool
    changes: int | None
    time_limit: float | None
    rungs: bool
    form: str
    output: str | None
    strict: bool


def run_propose(name: str, variant: str | None, wish: Wish) -> None:
    """Find the best plan, or the best for each number of changes, and show or write it."""
    _refuse_output_that_cannot_be(name, variant, wish)
    opened = open_flow(name, variant)
    opened.show_warnings()
    if wish.rungs:
        with _search(opened.flow) as how:
            steps = ladder(opened.flow, **_asked(wish, opened.flow), **how)
        _show_ladder(steps, wish.form)
        best = steps.steps[-1]
    else:
        with _search(opened.flow) as how:
            best = propose(opened.flow, changes=wish.changes, **_asked(wish, opened.flow), **how)
        _show_proposal(best, wish.form)
    if wish.form == "table":
        show_left_out(opened.flow, "the search weighs margins along single axes only")
    if wish.output:
        _write(name, opened, best, wish.output)
    if wish.strict and best.after.counts["fail"]:
        raise typer.Exit(Status.FAILS)


def _refuse_output_that_cannot_be(name: str, variant: str | None, wish: Wish) -> None:
    if wish.rungs and wish.changes is not None:
        hint = "leave one of them out"
        raise UsageError([Diagnostic("FP602", "--ladder tries every number of changes", hint)])
    if not wish.output:
        return
    refuse_output(wish.output, name)
    if variant is not None:
        message = "-o writes the file's own plan with new references, not a variant's"
        hint = "leave -o out, and change the variant by hand"
        raise UsageError([Diagnostic("FP602", message, hint)])


def _asked(wish: Wish, flow: Flow) -> dict[str, Any]:
    return {
        "goal": wish.goal,
        "free": _ids(wish.free, flow),
        "free_all": wish.free_all,
        "pin": _ids(wish.pin, flow),
        "same_reference": wish.same_reference,
        "time_limit": wish.time_limit,
        "workers": _WORKERS,
    }


def _ids(given: Iterable[str], flow: Flow) -> list[str]:
    """Return ids, each given by itself or several with commas between them."""
    return [part.strip() for text in given for part in ([text] if text in flow.layers else text.split(","))]


@contextmanager
def _search(flow: Flow) -> Iterator[dict[str, Any]]:
    """Show how far the search has come; Ctrl-C ends it with the best plan so far."""
    interrupted = False

    def interrupt(_number: int, _frame: FrameType | None) -> None:
        nonlocal interrupted
        if interrupted:
            raise KeyboardInterrupt
        interrupted = True

    figures = Figures(flow.unit, 3)
    before = signal.signal(signal.SIGINT, interrupt)
    try:
        with Bar("searching") as bar:
            watch = _Watcher(bar, figures)
            yield {"progress": watch.step, "stop": lambda: interrupted}
    finally:
        signal.signal(signal.SIGINT, before)
    if interrupted:
        tell("interrupted: this is the best plan found so far")


@dataclass(frozen=True, slots=True)
class _Watcher:
    bar: Bar
    figures: Figures

    def step(self, at: Progress) -> None:
        """Draw how far the search has come."""
        best, bound = (
            self.figures.text(value) if at.goal == "worst" else f"{value:.5g}"
            for value in (at.best, at.bound)
        )
        self.bar.step(at.closed, 1.0, f": best {best}, bound {bound}, {percent(at.closed)} closed")


def _write(name: str, opened: Opened, best: Proposal, output: str) -> None:
    from flowplan.files.references import write_references

    choices = {(change.mask, change.axis): change.after for change in best.changes}
    shown = "<stdin>" if name == STDIN else name
    write_output(output, write_references(opened.text, opened.flow, choices, shown), flow=name)
    tell(f"wrote {output}")


def _show_proposal(proposal: Proposal, form: str) -> None:
    if form == "json":
        emit_json(proposal_document(proposal))
        return
    text = proposal_text(proposal)
    (_proposal_markdown if form == "markdown" else _proposal_table)(text)


def _proposal_table(text: ProposalText) -> None:
    show_note(text.heading, strong=True)
    show_note(f"lengths in {text.unit}, {text.basis}")
    show_note(f"goal: {text.goal}")
    emit("")
    columns = (Column(""), Column("now", "right"), Column("proposed", "right"))
    show_table(columns, text.figures)
    emit("")
    if text.changes:
        show_table(*_changes(text))
        emit("")
        show_table(*_moving(text))
    else:
        emit("the plan in the file is kept")
    emit("")
    emit(text.proof)


def _changes(text: ProposalText) -> tuple[tuple[Column, ...], list[tuple[str, str, str, str]]]:
    columns = (Column("mask"), Column("axis"), Column("reads now"), Column("proposed"))
    return columns, [(c.mask, c.axes, c.before, c.after) for c in text.changes]


def _moving(text: ProposalText) -> tuple[tuple[Column, ...], list[list[str]]]:
    columns = (
        Column("pair"), Column("axis"), Column("now", "right"), Column("proposed", "right"),
        Column("change", "right"), Column("verdict"),
    )  # fmt: skip
    rows = [
        [row.label, row.axis, *(cell.margin for cell in row.cells), row.cells[1].change, row.fate(1)]
        for row in text.rows
    ]
    return columns, rows


def _proposal_markdown(text: ProposalText) -> None:
    lines = [
        f"## {text.heading}: proposed references",
        "",
        f"Goal: {text.goal}. Lengths in {text.unit}, {text.basis}.",
        "",
    ]
    lines += markdown_lines((Column(""), Column("now", "right"), Column("proposed", "right")), text.figures)
    lines += ["", *markdown_lines(*_changes(text)), "", *markdown_lines(*_moving(text)), "", f"{text.proof}."]
    emit("\n".join(lines))


def _show_ladder(found: Ladder, form: str) -> None:
    if form == "json":
        emit_json(ladder_document(found))
        return
    text = ladder_text(found)
    columns, rows = _rungs(text)
    if form == "markdown":
        lines = [f"## {text.heading}: best plan for each number of changes", "", f"Goal: {text.goal}.", ""]
        emit("\n".join([*lines, *markdown_lines(columns, rows), "", f"{text.answer}."]))
        return
    show_note(text.heading, strong=True)
    show_note(f"lengths in {text.unit}, {text.basis}")
    show_note(f"goal: {text.goal}")
    emit("")
    show_table(columns, rows)
    emit("")
    emit(text.answer)
    if not text.proved:
        emit("steps with * are the best found, not proved")


def _rungs(text: LadderText) -> tuple[tuple[Column, ...], list[tuple[str, ...]]]:
    numbers = ("changes", "worst", "gain", "pass", "tight", "fail")
    columns = (*(Column(name, "right") for name in numbers), Column("masks that read something else"))
    rows: list[tuple[str, ...]] = [
        (f"{r.changes}{'' if r.proved else ' *'}", r.worst, r.gain, *r.counts, r.masks) for r in text.rungs
    ]
    return columns, rows

"""``flowplan compare``: plans side by side."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.session import Opened, known_layer, open_flow
from flowplan.cli.streams import emit, emit_json, printable, tell
from flowplan.cli.tables import Column, markdown_lines, show_note, show_table
from flowplan.engine.analysis import Result, analyse
from flowplan.engine.compare import Comparison, compare
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.base import AXES, Axis
from flowplan.model.check import check
from flowplan.model.edits import self_aligned
from flowplan.model.flow import Basis, Flow
from flowplan.report.choosing import OWN_PLAN
from flowplan.report.comparison import (
    ComparisonText,
    PlanText,
    RowText,
    comparison_document,
    comparison_text,
)

MOST_FILES = 4
#: So many plans beside the first fit into 80 columns.
_ABREAST = 3
_COUNTS = ("pass", "tight", "fail")


@dataclass(frozen=True, slots=True)
class Plans:
    """What to compare and how to show it."""

    files: tuple[str, ...]
    variants: tuple[str, ...]
    self_align: tuple[str, ...]
    basis: Basis | None
    form: str
    every_row: bool
    output: str | None


@dataclass(frozen=True, slots=True)
class Named:
    """A flow under the name it has in the comparison."""

    name: str
    note: str
    flow: Flow


def run_compare(asked: Plans) -> None:
    """Compare the plans that were asked for and show what differs."""
    if asked.output:
        for file in asked.files:
            refuse_output(asked.output, file)
    plans = _plans(asked)
    results = [(plan.name, _judge(plan.flow, asked.basis)) for plan in plans]
    comparison, notes = compare(results), [plan.note for plan in plans]
    if asked.output:
        _write_page(asked, comparison, notes)
    elif asked.form == "json":
        emit_json(comparison_document(comparison, notes))
    else:
        text = comparison_text(comparison, notes)
        (_markdown if asked.form == "markdown" else _show)(text, every_row=asked.every_row)


def _write_page(asked: Plans, comparison: Comparison, notes: Sequence[str]) -> None:
    from flowplan.report.page import render_comparison

    output = str(asked.output)
    write_output(output, render_comparison(comparison_text(comparison, notes)), flow=asked.files[0])
    tell(f"wrote {output}")


def _judge(flow: Flow, basis: Basis | None) -> Result:
    return analyse(flow.model_copy(update={"basis": basis}) if basis else flow)


def _plans(asked: Plans) -> list[Named]:
    if len(asked.files) > MOST_FILES:
        message = f"{len(asked.files)} files are named; {MOST_FILES} fit side by side"
        raise UsageError([Diagnostic("FP602", message, "leave some out")])
    opened = [open_flow(file) for file in asked.files]
    for one in opened:
        one.show_warnings()
    first = opened[0]
    if len(opened) > 1:
        if asked.variants:
            hint = "name one file, or leave --variant out"
            raise UsageError([Diagnostic("FP602", "--variant chooses among the plans of one file", hint)])
        names = _file_names(asked.files)
        plans = [Named(n, o.flow.heading, o.flow) for n, o in zip(names, opened, strict=True)]
    else:
        plans = [Named(OWN_PLAN, "", first.flow), *_variants(first, asked)]
    plans += [_self_aligned(first.flow, text) for text in asked.self_align]
    if len(plans) < 2:
        hint = "add `variants:` to the file, name a second file, or try --self-align FEATURE:PARENT"
        raise UsageError([Diagnostic("FP602", "there is nothing to compare the flow with", hint)])
    return plans


def _file_names(files: tuple[str, ...]) -> list[str]:
    """Return the files' short names where they differ, else their names as given."""
    short = [Path(file).stem for file in files]
    return short if len(set(short)) == len(short) else list(files)


def _variants(opened: Opened, asked: Plans) -> list[Named]:
    notes = {variant.name: variant.note for variant in opened.flow.variants}
    if asked.variants:
        return [Named(name, notes.get(name, ""), opened.plan(name)) for name in dict.fromkeys(asked.variants)]
    if asked.self_align:
        return []
    return [Named(name, notes[name], flow) for name, flow in opened.variants.items()]


def _self_aligned(flow: Flow, text: str) -> Named:
    """Read ``FEATURE:PARENT[:x|y]`` and return the flow with that step self-aligned."""
    parts = text.split(":")
    if not 2 <= len(parts) <= 3 or not all(parts) or (len(parts) == 3 and parts[2] not in AXES):
        hint = "write --self-align FEATURE:PARENT, or FEATURE:PARENT:x for one axis"
        raise UsageError([Diagnostic("FP602", f"{text!r} does not name a feature and its parent", hint)])
    feature, parent = (known_layer(flow, part) for part in parts[:2])
    axes: tuple[Axis, ...] = AXES if len(parts) == 2 else ("x",) if parts[2] == "x" else ("y",)
    if all(mask.id != feature for mask in flow.masks):
        hint = "name a mask that the step would take the place of"
        raise UsageError([Diagnostic("FP602", f"{feature!r} is self-aligned already", hint)])
    changed = self_aligned(flow, feature, parent, axes)
    faults = [d for d in check(changed) if d.severity == "error"]
    if faults:
        raise UsageError([Diagnostic("FP602", f"--self-align {text}: {d.message}", d.hint) for d in faults])
    along = "" if len(axes) == 2 else f" along {axes[0]}"
    note = "no exposure of its own; it grows with what it follows and keeps its own edge variation"
    return Named(f"{feature} self-aligned to {parent}{along}", note, changed)


def _show(text: ComparisonText, *, every_row: bool) -> None:
    show_note(text.heading, strong=True)
    show_note(f"margins in {text.unit}, {text.note}" + (f"; {text.landings}" if text.landings else ""))
    emit("")
    _show_plans(text.plans)
    for plan in text.plans[1:]:
        _show_changes(plan)
    rows = text.rows if every_row else text.moving
    for start in range(1, len(text.plans), _ABREAST):
        chosen = (0, *range(start, min(start + _ABREAST, len(text.plans))))
        emit("")
        if rows:
            show_table(*_table(text, rows, chosen))
    left = len(text.rows) - len(rows)
    if left:
        emit("" if rows else "no margin moves")
        show_note(f"{left} margins are the same in every plan (--all shows them)")


def _show_plans(plans: tuple[PlanText, ...]) -> None:
    columns = (
        Column(""), Column("plan"), *(Column(count, "right") for count in _COUNTS), Column("worst", "right"),
        Column("at"),
    )  # fmt: skip
    show_table(
        columns, [(p.letter, p.name, *(p.counts[c] for c in _COUNTS), p.worst, p.worst_at) for p in plans]
    )


def _show_changes(plan: PlanText) -> None:
    emit("")
    show_note(f"{plan.letter}: {plan.name}", strong=True)
    if plan.note:
        show_note(f"  {plan.note}")
    rows = [(c.of, c.what, f"{c.before} to {c.after}" if c.before else "") for c in plan.changes]
    if rows:
        show_table((Column("changes"), Column(""), Column("")), rows, indent=2)
    else:
        emit("  changes nothing")
    if plan.settles:
        emit("  settles " + printable(", ".join(plan.settles)))


def _table(
    text: ComparisonText, rows: Sequence[RowText], chosen: Sequence[int]
) -> tuple[list[Column], list[list[str]]]:
    """Return columns and cells; beside more than one other plan, a verdict that stays is left out."""
    columns = [Column("pair"), Column("axis")]
    if len(chosen) == 2:
        columns += [Column(text.plans[i].letter, "right") for i in chosen]
        columns += [Column("change", "right"), Column("verdict")]
        other = chosen[1]
        return columns, [
            [r.label, r.axis, *(r.cells[i].margin for i in chosen), r.cells[other].change, r.fate(other)]
            for r in rows
        ]
    for i in chosen:
        columns += [Column(text.plans[i].letter, "right"), Column("")]
    return columns, [[r.label, r.axis, *_abreast(r, chosen)] for r in rows]


def _abreast(row: RowText, chosen: Sequence[int]) -> Iterator[str]:
    for i in chosen:
        cell = row.cells[i]
        yield cell.margin
        yield cell.verdict if i == 0 or cell.verdict != row.cells[0].verdict else ""


def _markdown(text: ComparisonText, *, every_row: bool) -> None:
    lines = [f"## {text.heading}: plans compared", "", f"Margins in {text.unit}, {text.note}.", ""]
    columns = [Column(""), Column("plan"), *(Column(c, "right") for c in (*_COUNTS, "worst"))]
    columns.append(Column("at"))
    rows: list[Any] = [
        (p.letter, p.name, *(p.counts[c] for c in _COUNTS), p.worst, p.worst_at) for p in text.plans
    ]
    lines += markdown_lines(columns, rows)
    changes = [(p.letter, c.of, c.what, c.before, c.after) for p in text.plans for c in p.changes]
    lines += [
        "",
        *markdown_lines([Column(c) for c in ("plan", "of", "what", "before", "after")], changes),
        "",
    ]
    chosen = range(len(text.plans))
    shown = text.rows if every_row else text.moving
    lines += markdown_lines(*_table(text, shown, chosen))
    emit("\n".join(lines))

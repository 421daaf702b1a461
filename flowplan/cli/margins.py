"""``flowplan margins``: every margin as a table or for other programs."""

import csv
import io
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import typer

from flowplan.cli.check import verdict_line, worst_line
from flowplan.cli.options import Form, Order
from flowplan.cli.session import known_layer, read_flow
from flowplan.cli.status import Status
from flowplan.cli.streams import emit, emit_json, folded, printable
from flowplan.cli.tables import Column, markdown_lines, show_note, show_table
from flowplan.engine.analysis import Result, analyse, every_pair
from flowplan.engine.landing import LandingEntry
from flowplan.engine.results import Entry, Verdict
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.flow import BASES, Basis
from flowplan.report.landing import LANDING_HEADS, LANDING_NOTE, landing_cells
from flowplan.report.records import check_record, margins_document
from flowplan.report.textfigures import Figures


@dataclass(frozen=True, slots=True)
class Choice:
    """Which margins are shown, and how."""

    form: Form
    order: Order
    basis: Basis | None
    layers: tuple[str, ...]
    verdicts: tuple[Verdict, ...]
    every_pair: bool
    strict: bool


def margins(name: str, variant: str | None, choice: Choice) -> None:
    """Print the margins of a flow."""
    if choice.every_pair and choice.strict:
        hint = "leave one of them out"
        message = "--every-pair lists overlays without a limit, so --strict has nothing to judge"
        raise UsageError([Diagnostic("FP602", message, hint)])
    flow = read_flow(name, variant)
    if choice.basis:
        flow = flow.model_copy(update={"basis": choice.basis})
    wanted = {
        member for layer in choice.layers for member in flow.expand(known_layer(flow, layer, split=True))
    }
    result = analyse(flow, every_pair(flow) if choice.every_pair else None)
    of_layers = _only(result, lambda e: not wanted or bool(wanted & set(e.layers)))
    shown = _only(of_layers, lambda e: not choice.verdicts or e.verdict in choice.verdicts)
    if choice.order is Order.MARGIN:
        by_margin = tuple(sorted(shown.entries, key=lambda e: _room(result, e)))
        shown = Result(result.engine, by_margin, shown.landings)
    _PRINTERS[choice.form](shown)
    if choice.strict and of_layers.counts["fail"]:
        raise typer.Exit(Status.FAILS)


def _only(result: Result, wanted: Callable[[Entry | LandingEntry], bool]) -> Result:
    """Return the result with only some of what is judged."""
    return Result(
        result.engine,
        tuple(e for e in result.entries if wanted(e)),
        tuple(e for e in result.landings if wanted(e)),
    )


def _room(result: Result, entry: Entry) -> float:
    """Return what is left; where nothing is judged, what the errors take, after all that is judged."""
    return float("inf") if entry.margin is None else result.margin(entry)


_LEADING = (Column("pair"), Column("layers"), Column("axis"), Column("through"))
_JUDGED = (Column("need", "right"), Column("margin", "right"), Column("verdict"))
_OVERLAY = (Column("overlay", "right"),)


def _table(result: Result) -> tuple[tuple[Column, ...], list[list[str]]]:
    """Return the columns and cells for people: overlays alone where nothing is judged."""
    basis = result.flow.basis
    figures = Figures.fitting(result.flow.unit, [e.need.on(basis) for e in result.entries])
    judged = any(e.margin is not None for e in result.entries)
    rows = []
    for entry in result.entries:
        row = [entry.pair.name, " - ".join(entry.layers), entry.axis, _through(entry)]
        row.append(figures.text(_taken(entry, basis)))
        if judged:
            row += [figures.text(entry.margin.on(basis) if entry.margin else None), entry.verdict]
        rows.append(row)
    return (*_LEADING, *(_JUDGED if judged else _OVERLAY)), rows


def _landings(result: Result) -> tuple[tuple[Column, ...], list[list[str]]]:
    """Return columns and cells of the landed areas."""
    columns = (Column("pair"), *(Column(head, "right") for head in LANDING_HEADS), Column("verdict"))
    return columns, [[e.pair.name, *landing_cells(e), e.verdict] for e in result.landings]


def _taken(entry: Entry, basis: Basis) -> float:
    """Return what the errors take; without a limit the known offset belongs to it."""
    return entry.need.on(basis) + (abs(entry.overlay.offset) if entry.margin is None else 0.0)


def _through(entry: Entry) -> str:
    """Return the common reference, ``direct`` when one layer is the other's reference."""
    way = "direct" if len(entry.chain.layers) == 2 else entry.chain.through
    return f"{way} *" if entry.chain.one_of_several else way


def _show(result: Result) -> None:
    flow = result.flow
    show_note(flow.heading, strong=True)
    show_note(f"lengths in {flow.unit}, {flow.basis} basis, {flow.confidence:g} sigma")
    emit("")
    if not result.checks:
        emit("no pair fits what was asked for" if flow.pairs else "the flow has no pairs")
        return
    if result.entries:
        show_table(*_table(result))
        emit("")
    if result.landings:
        show_note(LANDING_NOTE)
        show_table(*_landings(result))
        emit("")
    emit(verdict_line(result))
    emit(folded(f"worst: {printable(worst_line(result))}", 7))
    if any(e.chain.one_of_several for e in result.entries):
        show_note("* one of several ways: references are averaged")


def _markdown(result: Result) -> None:
    columns, rows = _table(result)
    unit = result.flow.unit
    named = [
        Column(f"{c.name} [{unit}]", c.align) if c.align == "right" else Column(c.name, c.align)
        for c in columns
    ]
    lines = markdown_lines(named, rows) if result.entries or not result.landings else []
    if result.landings:
        lines += ["", *markdown_lines(*_landings(result))]
    emit("\n".join(lines).lstrip())


CSV_COLUMNS = (
    "pair", "rule", "first", "second", "axis", "chain", "through", "unit", "drawn", "keep", "nominal",
    "offset", "bound", "random", "overlay_offset", "overlay_bound", "overlay_random",
    "need_mixed", "need_rss", "need_linear", "margin_mixed", "margin_rss", "margin_linear",
    "verdict", "cpk", "fail_ppm", "point_X", "point_Y", "point_x", "point_y", "chain_rss",
)  # fmt: skip
_LANDING_KEYS = ("nominal_area", "mean_area", "p_below_least", "p_open")


def _csv(result: Result) -> None:
    text = io.StringIO()
    more = [f"landing_{key}" for key in _LANDING_KEYS] if result.landings else []
    writer = csv.DictWriter(text, [*CSV_COLUMNS, *more], lineterminator="\n")
    writer.writeheader()
    for entry in result.checks:
        row = _csv_row(entry, result.flow.unit)
        writer.writerow({k: printable(v) if isinstance(v, str) else v for k, v in row.items()})
    emit(text.getvalue().rstrip("\n"))


def _csv_row(entry: Entry | LandingEntry, unit: str) -> dict[str, Any]:
    record = check_record(entry, unit)
    row = {key: record[key] for key in CSV_COLUMNS if key in record}
    row |= {"first": entry.layers[0], "second": entry.layers[1], "unit": unit}
    row["chain"] = " > ".join(record["chain"] or ())
    row |= _flat("overlay", record["overlay"], ("offset", "bound", "random"))
    row |= _flat("need", record["need"], BASES)
    row |= _flat("margin", record["margin"], BASES)
    if isinstance(entry, LandingEntry):
        row |= _flat("landing", record["landing"], _LANDING_KEYS)
    return row | _flat("point", record["point"], ("X", "Y", "x", "y"))


def _flat(name: str, record: dict[str, Any] | None, keys: Sequence[str]) -> dict[str, Any]:
    return {f"{name}_{key}": (record or {}).get(key) for key in keys}


_PRINTERS = {
    Form.TABLE: _show,
    Form.JSON: lambda result: emit_json(margins_document(result)),
    Form.CSV: _csv,
    Form.MARKDOWN: _markdown,
}

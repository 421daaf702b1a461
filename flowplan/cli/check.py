"""``flowplan check``: is the flow sound, and how does it stand."""

from typing import Any

import typer

from flowplan.cli.findings import count_findings, finding_record
from flowplan.cli.session import Opened, open_flow
from flowplan.cli.status import Status
from flowplan.cli.streams import emit, emit_json, folded, printable, tell
from flowplan.engine.analysis import Result, analyse
from flowplan.errors import Diagnostic, FlowError
from flowplan.report.records import entry_record
from flowplan.report.textfigures import Figures


def check(name: str, variant: str | None, *, strict: bool, as_json: bool) -> None:
    """Read a flow, print what was found and a summary of a sound one."""
    try:
        opened = open_flow(name, variant)
    except FlowError as error:
        if as_json:
            emit_json(_document(error.diagnostics, None))
            raise typer.Exit(Status.INPUT) from None
        raise
    result = analyse(opened.flow)
    if as_json:
        emit_json(_document(opened.warnings, result))
    else:
        opened.show_warnings()
        _show_summary(opened, result)
    if strict and result.counts["fail"]:
        if not as_json:
            noun = "checks" if result.landings else "margins"
            tell(f"flowplan: {result.counts['fail']} of {len(result.checks)} {noun} fail")
        raise typer.Exit(Status.FAILS)


def verdict_line(result: Result) -> str:
    """Return the verdict counts in words, such as ``5 pass, 1 tight, 1 fail``."""
    return ", ".join(f"{n} {word}" for word, n in result.counts.items() if n or word == "fail")


def worst_line(result: Result) -> str:
    """Return the worst pair with its margin, in words."""
    worst = result.worst
    if worst is None:
        return "nothing is judged"
    figures = Figures.fitting(result.flow.unit, [e.need.mixed for e in result.entries])
    margin = figures.with_unit(result.margin(worst))
    layers = " - ".join(worst.layers)
    named = f"{worst.pair.name} ({layers})" if worst.pair.layers != worst.layers else worst.pair.name
    return f"{named} along {worst.axis}, margin {margin}, {worst.verdict}"


def _show_summary(opened: Opened, result: Result) -> None:
    flow = opened.flow
    features = _count(len(flow.self_aligned), "self-aligned feature") if flow.self_aligned else ""
    used = len({mask.tool for mask in flow.masks})
    rows = [
        ("masks", f"{len(flow.masks)} on {_count(used, 'tool')}" + (f", {features}" if features else "")),
        ("pairs", f"{len(flow.pairs)}, judged as {_judged(result)}"),
        ("verdicts", f"{verdict_line(result)} ({flow.basis} basis, {flow.confidence:g} sigma)"),
        ("worst", worst_line(result)),
    ]
    if opened.variants and flow.variant is None:
        rows.append(("variants", ", ".join(opened.variants)))
    found = count_findings(opened.warnings)
    emit(folded(f"{printable(flow.heading)}: sound" + (f", with {found}" if found else ""), 2))
    for label, value in rows:
        emit(folded(f"  {label:<9} {printable(value)}", 12))


def _judged(result: Result) -> str:
    landings = len(result.landings)
    return _count(len(result.entries), "margin") + (f" and {_count(landings, 'landing')}" if landings else "")


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"


def _document(findings: tuple[Diagnostic, ...], result: Result | None) -> dict[str, Any]:
    document: dict[str, Any] = {
        "sound": result is not None,
        "findings": [finding_record(finding) for finding in findings],
        "summary": None,
    }
    if result is not None:
        flow, worst = result.flow, result.worst
        document["summary"] = {
            "flow": flow.flow,
            "revision": flow.revision or None,
            "variant": flow.variant,
            "unit": flow.unit,
            "masks": len(flow.masks),
            "tools": len({mask.tool for mask in flow.masks}),
            "self_aligned": len(flow.self_aligned),
            "pairs": len(flow.pairs),
            "counts": dict(result.counts),
            "worst": None if worst is None else entry_record(worst, flow.unit),
        }
    return document

"""``flowplan report``: the report as one HTML page."""

import gc
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import typer

from flowplan.cli.check import verdict_line, worst_line
from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.progress import Bar
from flowplan.cli.session import STDIN, open_flow
from flowplan.cli.status import Status
from flowplan.cli.streams import printable, tell
from flowplan.engine.analysis import analyse


def report(name: str, variant: str | None, output: str | None, *, strict: bool) -> None:
    """Write the report of a flow and say where, and how the flow stands."""
    target = output or default_output(name)
    refuse_output(target, name)
    opened = open_flow(name, variant)
    opened.show_warnings()
    from flowplan.report.choosing import report_extras
    from flowplan.report.page import render_report

    with Bar("margins") as bar:
        result = analyse(opened.flow, progress=bar.step)
    with Bar("remedies") as bar:
        extras = report_extras(result, opened.variants, progress=bar.step)
    with Bar("report") as bar, _no_search_for_cycles():
        page = render_report(result, progress=bar.step, extras=extras)
    write_output(target, page, flow=name)
    tell(f"wrote {printable(target)}")
    tell(verdict_line(result))
    tell(f"worst: {printable(worst_line(result))}")
    if strict and result.counts["fail"]:
        raise typer.Exit(Status.FAILS)


@contextmanager
def _no_search_for_cycles() -> Iterator[None]:
    """Keep the collector still: a large report's records all live to its end and hold no cycles."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def default_output(flow: str) -> str:
    """Return the flow file's name with ``.html``, in the current folder."""
    return "flow.html" if flow == STDIN else Path(flow).with_suffix(".html").name

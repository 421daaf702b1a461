"""``flowplan report``: the report as one HTML page."""

import gc
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

import typer

from flowplan.cli.check import verdict_line, worst_line
from flowplan.cli.options import SignName
from flowplan.cli.output import refuse_output, write_output
from flowplan.cli.progress import Bar
from flowplan.cli.session import STDIN, open_flow
from flowplan.cli.status import Status
from flowplan.cli.streams import printable, tell
from flowplan.engine.analysis import Result, analyse

if TYPE_CHECKING:
    from flowplan.report.viewmeasured import MeasuredView
    from flowplan.report.viewsimulation import SimulationView


@dataclass(frozen=True, slots=True)
class MeasuredData:
    """Measured overlay that the report shows, and how it is read."""

    file: str
    columns: str | None
    sign: SignName
    limit: float | None


def report(
    name: str,
    variant: str | None,
    output: str | None,
    *,
    strict: bool,
    samples: int | None = None,
    data: MeasuredData | None = None,
) -> None:
    """Write the report of a flow and say where, and how the flow stands.

    Parameters
    ----------
    name, variant, output : str
        The flow file, which of its plans, and where to write.
    strict : bool
        End with status 1 if a pair fails.
    samples : int, optional
        Simulate the flow with so many samples, and show what comes of it.
    data : MeasuredData, optional
        Measured overlay to hold against the plan.
    """
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
    if samples is not None:
        extras = replace(extras, simulation=_simulated(result, samples))
    if data is not None:
        extras = replace(extras, measured=_measured(result, data))
    with Bar("report") as bar, _no_search_for_cycles():
        page = render_report(result, progress=bar.step, extras=extras)
    write_output(target, page, flow=name)
    tell(f"wrote {printable(target)}")
    tell(verdict_line(result))
    tell(f"worst: {printable(worst_line(result))}")
    if strict and result.counts["fail"]:
        raise typer.Exit(Status.FAILS)


def _simulated(result: Result, samples: int) -> "SimulationView":
    from flowplan.engine.simulate import Options, simulate
    from flowplan.report.viewsimulation import simulation_view

    with Bar("simulating") as bar:
        found = simulate(
            result, Options(samples), lambda done, total, what: bar.step(done, total, f" {what}")
        )
    return simulation_view(found)


def _measured(result: Result, data: MeasuredData) -> "MeasuredView":
    from flowplan.cli.measured import ask, warn
    from flowplan.report.measuring import take_measurements
    from flowplan.report.viewmeasured import measured_view

    asked = ask(data.columns, data.sign, data.limit)
    with Bar("measured data") as bar:
        taken = take_measurements(result.flow, data.file, asked, bar.step)
    warn(taken)
    return measured_view(taken)


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

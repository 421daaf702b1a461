"""``flowplan simulate``: the flow's errors drawn at random, and what fails of it."""

from dataclasses import dataclass

from flowplan.cli.options import CompareForm
from flowplan.cli.progress import Bar
from flowplan.cli.session import read_flow
from flowplan.cli.streams import emit, emit_json, folded, printable
from flowplan.cli.tables import Column, markdown_lines, show_left_out, show_note, show_table
from flowplan.engine.analysis import analyse
from flowplan.engine.simulate import Options, Simulation
from flowplan.engine.simulate import simulate as work
from flowplan.report.simulation import PAIR_HEADINGS, SimulationText, simulation_document, simulation_text

_COLUMNS = tuple(Column(name, "right" if figure else "left") for name, figure in PAIR_HEADINGS)
#: Rows of a table that is not asked for in full.
_MOST = 20


@dataclass(frozen=True, slots=True)
class SimulateChoice:
    """How the flow is simulated, and what is shown of it."""

    options: Options
    every: bool
    form: CompareForm


def simulate(name: str, variant: str | None, choice: SimulateChoice) -> None:
    """Print what a simulation of the flow finds."""
    flow = read_flow(name, variant)
    with Bar("simulating") as bar:
        found = work(
            analyse(flow), choice.options, lambda done, total, what: bar.step(done, total, f" {what}")
        )
    if choice.form is CompareForm.JSON:
        emit_json(simulation_document(found))
        return
    text = simulation_text(found, None if choice.every else _MOST)
    (_markdown if choice.form is CompareForm.MARKDOWN else _show)(found, text)


def _show(found: Simulation, text: SimulationText) -> None:
    show_note(found.flow.heading, strong=True)
    show_note(text.heading)
    emit("")
    show_table(_COLUMNS, text.rows)
    if text.left_out:
        emit(f"{text.left_out} more are less likely to fail (--all shows them)")
    emit("")
    widest = max(len(name) for name, _, _ in text.yields)
    for name, figure, words in text.yields:
        emit(folded(f"{name:{widest}}  {figure}: {words}", widest + 2))
    emit("")
    for line in text.legend:
        show_note(line)
    show_left_out(found.flow)


def _markdown(found: Simulation, text: SimulationText) -> None:
    emit(f"# {printable(found.flow.heading)}: simulation")
    emit("")
    emit(f"{text.heading[0].upper()}{text.heading[1:]}.")
    emit("")
    for name, figure, words in text.yields:
        emit(f"- {name}: **{figure}**, {words}")
    emit("")
    emit("\n".join(markdown_lines(_COLUMNS, text.rows)))
    if text.left_out:
        emit("")
        emit(f"{text.left_out} more are less likely to fail.")

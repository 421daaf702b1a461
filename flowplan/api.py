"""What library users and both faces call: load a flow, analyse it, render it."""

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from flowplan.engine import analysis
from flowplan.engine.results import Entry, Verdict
from flowplan.files.reader import load, load_with_warnings, parse
from flowplan.model.flow import Flow
from flowplan.report.records import check_record, margins_document

if TYPE_CHECKING:
    from flowplan.engine.simulate import Simulation

__all__ = ["Analysis", "analyse", "load", "load_with_warnings", "parse"]


@dataclass(frozen=True, slots=True)
class Analysis:
    """The margins of a flow, with ways to look at them.

    Attributes
    ----------
    result : flowplan.engine.analysis.Result
        The engine's records, lengths in nm.
    """

    result: analysis.Result

    @property
    def flow(self) -> Flow:
        """The flow that was analysed."""
        return self.result.flow

    @property
    def entries(self) -> tuple[Entry, ...]:
        """One entry per pair, layers of a split layer and axis; lengths in nm."""
        return self.result.entries

    @property
    def counts(self) -> dict[Verdict, int]:
        """How many entries got each verdict."""
        return self.result.counts

    @property
    def worst(self) -> Entry | None:
        """The judged entry with the smallest margin."""
        return self.result.worst

    def simulate(
        self, samples: int = 100_000, seed: int = 1, bounds: Literal["worst", "uniform"] = "worst"
    ) -> "Simulation":
        """Draw every error at random, and count what fails.

        Parameters
        ----------
        samples : int
            Draws of every error.
        seed : int
            The same seed gives the same answer.
        bounds : {'worst', 'uniform'}
            A bound at its worst sign for each pair and side, or drawn evenly over its range.

        Returns
        -------
        Simulation
            Fail fractions, quantiles, joint yield and good fields; lengths in nm.

        Raises
        ------
        UsageError
            When the flow judges no pair.
        """
        from flowplan.engine.simulate import Options, simulate

        return simulate(self.result, Options(samples, seed, bounds))

    def to_records(self) -> list[dict[str, Any]]:
        """Return the entries as plain dictionaries, lengths in the file's unit."""
        return [check_record(check, self.flow.unit) for check in self.result.checks]

    def to_document(self) -> dict[str, Any]:
        """Return what ``flowplan margins --format json`` prints."""
        return margins_document(self.result)

    def to_html(self) -> str:
        """Return the report as one self-contained HTML page."""
        from flowplan.report.page import render_report

        return render_report(self.result)

    def _repr_html_(self) -> str:
        from flowplan.report.notebook import summary_html

        return summary_html(self.result)


def analyse(flow: Flow) -> Analysis:
    """Work out every margin of a flow.

    Parameters
    ----------
    flow : Flow
        As returned by `load`.

    Returns
    -------
    Analysis
        The margins in file order.

    Examples
    --------
    >>> import flowplan
    >>> flow = flowplan.load("flows/cmos.yaml")  # doctest: +SKIP
    >>> flowplan.analyse(flow).worst.pair.name  # doctest: +SKIP
    """
    return Analysis(analysis.analyse(flow))

"""Measured data beside a flow: the file is read, added up and summed up."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from flowplan.engine.analysis import Engine
from flowplan.engine.measured.batch import Batch
from flowplan.engine.measured.robust import LIMIT
from flowplan.engine.measured.sizes import Sizes, sizes_of
from flowplan.engine.measured.summary import Measured, summarise
from flowplan.engine.measured.tally import Ledger
from flowplan.errors import Diagnostic, FlowError, Span
from flowplan.files.headings import OPTIONAL
from flowplan.files.measurements import Measurements, open_measurements
from flowplan.model.flow import Flow

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True)
class Asked:
    """How a measurement file is read.

    Attributes
    ----------
    columns : mapping of str to str
        Headings that are not called as flowplan calls them.
    reversed_sign : bool
        Whether the file has reference minus mask.
    limit : float or None
        Robust standard deviations beyond which a row is an outlier; None keeps all rows.
    """

    columns: Mapping[str, str] = field(default_factory=dict)
    reversed_sign: bool = False
    limit: float | None = LIMIT


@dataclass(frozen=True, slots=True)
class Taken:
    """Measured data beside a flow.

    Attributes
    ----------
    measured : Measured
        What the rows say.
    sizes : Sizes
        What they say about the flow's sizes.
    data : Measurements
        The file, gone through.
    """

    measured: Measured
    sizes: Sizes
    data: Measurements

    @property
    def n_read(self) -> int:
        """Rows that could be read."""
        return self.data.n_rows - self.data.n_unreadable

    def warnings(self) -> tuple[Diagnostic, ...]:
        """Return what deserves a word: unreadable rows, columns left out, layers nobody knows."""
        data = self.data
        start = Span(data.source.file, 1, 1)
        found = [
            Diagnostic("FP702", f"no column {name}: {OPTIONAL[name]}", "", span=start, severity="warning")
            for name in data.source.columns.missing
        ]
        found += data.warnings()
        if self.measured.unknown:
            names = ", ".join(repr(name) for name in self.measured.unknown)
            hint = "their overlay is shown, but there is no plan to hold it against"
            message = f"the flow has no layer called {names}"
            found.append(Diagnostic("FP301", message, hint, span=start, severity="warning"))
        return tuple(found)


def take_measurements(
    flow: Flow, file: str, asked: Asked | None = None, progress: Progress | None = None
) -> Taken:
    """Read a measurement file and hold it against a flow.

    Parameters
    ----------
    flow : Flow
        The plan.
    file : str
        CSV or Parquet.
    asked : Asked, optional
        How it is read.
    progress : callable, optional
        Called with (passes done, passes in all).

    Raises
    ------
    FlowError
        FP701, FP702, when the file cannot be read; FP703, when not one row can.
    """
    asked = asked or Asked()
    data = open_measurements(file, flow.unit, asked.columns, reversed_sign=asked.reversed_sign)
    ledger = Ledger(asked.limit)
    for rows in data.batches(progress):
        ledger.add(Batch(rows.reading, rows.lot, rows.wafer, rows.positions, rows.overlay, rows.row))
        del rows  # so that two passes are never held together
    if data.n_unreadable == data.n_rows:
        none = Diagnostic(
            "FP703", "the file has no row that can be read", "is this the right file?", span=Span(file, 1, 1)
        )
        raise FlowError([*data.warnings(), none] if data.n_rows else [none])
    measured = summarise(Engine.of(flow), ledger, list(data.readings))
    return Taken(measured, sizes_of(measured), data)

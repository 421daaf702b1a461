"""Reading measured overlay from CSV or Parquet, a bounded number of rows at a time.

The file is gone through as often as it takes to hold at most `ROWS_AT_ONCE` rows in memory; each time
those wafers are taken whose hash says so, so that a wafer always comes in one piece, whatever the order
of the rows.
"""

import os
from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor, wait
from dataclasses import dataclass, field
from functools import partial
from typing import TYPE_CHECKING, TypeVar

import numpy as np
from numpy.typing import NDArray

from flowplan.errors import Diagnostic
from flowplan.files.headings import NUMBERS, WORDS
from flowplan.files.measuredrows import LINES_BEFORE, Source, open_source
from flowplan.files.unreadable import explain_lines
from flowplan.units import convert

if TYPE_CHECKING:
    import polars as pl

#: Rows that are held in memory together.
ROWS_AT_ONCE = 8_000_000
#: Unreadable rows that are shown one by one.
MOST_SHOWN = 10
_TICK = 0.3

Progress = Callable[[int, int], None]
_T = TypeVar("_T")


@dataclass(frozen=True, slots=True)
class Rows:
    """Some rows of a measurement file, whole wafers of them.

    Attributes
    ----------
    reading, lot, wafer : ndarray of int, shape (n,)
        Numbers into `Measurements.readings` and `Measurements.lots`; wafers are told apart within
        these rows only.
    positions : ndarray, shape (n, 4)
        Field centre X, Y and site x, y [mm].
    overlay : ndarray, shape (n, 2)
        Mask minus reference [nm].
    row : ndarray of int, shape (n,)
        Row in the file, from 0.
    """

    reading: NDArray[np.int64]
    lot: NDArray[np.int64]
    wafer: NDArray[np.int64]
    positions: NDArray[np.float64]
    overlay: NDArray[np.float64]
    row: NDArray[np.int64]


@dataclass(slots=True)
class Measurements:
    """A measurement file.

    Parameters
    ----------
    source : Source
        The file, opened.
    unit : str
        Length unit of dx and dy.
    reversed_sign : bool
        Whether the file has reference minus mask.
    rows_at_once : int
        The most rows held together.

    Attributes
    ----------
    readings : dict of (str, str) to int
        The number of each reading, mask and reference, as they turn up.
    lots : dict of str to int
        The number of each lot.
    n_rows, n_unreadable : int
        Rows in the file and those that cannot be read, once `batches` has gone through.
    """

    source: Source
    unit: str
    reversed_sign: bool = False
    rows_at_once: int = ROWS_AT_ONCE
    readings: dict[tuple[str, str], int] = field(default_factory=dict)
    lots: dict[str, int] = field(default_factory=dict)
    n_rows: int = 0
    n_unreadable: int = 0
    _bad: list[int] = field(default_factory=list)

    def batches(self, progress: Progress | None = None) -> Iterator[Rows]:
        """Go through the file; every good row comes once.

        Parameters
        ----------
        progress : callable, optional
            Called a few times a second with (passes done, passes in all).
        """
        passes = max(1, -(-self.source.estimated_rows() // self.rows_at_once))
        for number in range(passes):
            frame = _waited_for(
                partial(self.source.collect, number, passes),
                partial(progress or _silent, number, passes),
            )
            self.n_rows += frame.height
            if not frame["good"].all():
                self._note_unreadable(frame)
                frame = frame.filter("good")
            if frame.height:
                rows = self._rows(frame)
                del frame
                yield rows
                del rows  # so that two passes are never held together

    def warnings(self) -> tuple[Diagnostic, ...]:
        """Return the first unreadable rows, each with its place and reason."""
        return explain_lines(self.source.file, self.source.layout, sorted(self._bad)[:MOST_SHOWN])

    def place(self, row: int) -> str:
        """Return where a row stands: file and line, or file and row."""
        if self.source.layout is None:
            return f"{self.source.file}, row {row + 1}"
        return f"{self.source.file}:{row + LINES_BEFORE + 1}"

    def _note_unreadable(self, frame: "pl.DataFrame") -> None:
        import polars as pl

        bad = frame.filter(~pl.col("good"))["row"]
        self.n_unreadable += len(bad)
        self._bad += bad.bottom_k(MOST_SHOWN).to_list()

    def _rows(self, frame: "pl.DataFrame") -> Rows:
        mask, reference, lot, wafer = (_codes(frame[name]) for name in WORDS)
        pairs = mask[0] * len(reference[1]) + reference[0]
        table = np.zeros(len(mask[1]) * len(reference[1]), dtype=np.int64)
        for code in np.flatnonzero(np.bincount(pairs)):
            name = mask[1][code // len(reference[1])], reference[1][code % len(reference[1])]
            table[code] = self.readings.setdefault(name, len(self.readings))
        lots = np.array([self.lots.setdefault(name, len(self.lots)) for name in lot[1]], dtype=np.int64)
        factor = convert(1.0, self.unit, "nm") * (-1.0 if self.reversed_sign else 1.0)
        numbers = {name: frame[name].to_numpy() for name in NUMBERS}
        return Rows(
            table[pairs],
            lots[lot[0]],
            wafer[0],
            np.column_stack([numbers[name] for name in NUMBERS[:4]]),
            np.column_stack([numbers[name] for name in NUMBERS[4:]]) * factor,
            frame["row"].to_numpy().astype(np.int64),
        )


def open_measurements(
    file: str | os.PathLike[str],
    unit: str,
    columns: Mapping[str, str] | None = None,
    *,
    reversed_sign: bool = False,
    rows_at_once: int = ROWS_AT_ONCE,
) -> Measurements:
    """Open a measurement file.

    Parameters
    ----------
    file : path-like
        CSV, or Parquet when its name ends in ``.parquet``.
    unit : str
        Length unit of dx and dy; positions are mm.
    columns : mapping of str to str, optional
        Headings of columns that are not called as `HEADINGS` knows them.
    reversed_sign : bool
        Whether dx and dy are reference minus mask.
    rows_at_once : int
        The most rows held in memory together.

    Raises
    ------
    FlowError
        FP701, when the file cannot be read; FP702, when it lacks a column.
    """
    return Measurements(open_source(os.fspath(file), columns or {}), unit, reversed_sign, rows_at_once)


def _codes(series: "pl.Series") -> tuple[NDArray[np.int64], list[str]]:
    """Return a column of words as numbers from 0 and what each stands for."""
    import polars as pl

    codes = series.to_physical().to_numpy().astype(np.int64)
    distinct = series.unique()
    physical, names = distinct.to_physical().to_numpy().astype(np.int64), distinct.cast(pl.String).to_list()
    order = np.argsort(physical)
    table = np.zeros(int(physical.max()) + 1, dtype=np.int64)
    table[physical[order]] = np.arange(len(order))
    return table[codes], [names[i] for i in order]


def _silent(done: int, total: int) -> None:
    pass


def _waited_for(work: Callable[[], _T], tick: Callable[[], object]) -> _T:
    """Return what the work returns, telling the time while it runs."""
    with ThreadPoolExecutor(1) as pool:
        running = pool.submit(work)
        while not running.done():
            wait([running], timeout=_TICK)
            tick()
        return running.result()

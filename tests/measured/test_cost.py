"""What measured data cost: a small multiple of reading the file, in memory that does not grow with it."""

import resource
import tracemalloc
from pathlib import Path

import numpy as np
import polars as pl

from flowplan.engine.measured.batch import Batch
from flowplan.engine.measured.tally import Ledger
from flowplan.files.measurements import open_measurements


def write(file: Path, n: int) -> str:
    """Write rows of 9 sites, 60 fields, many wafers."""
    i = np.arange(n)
    rng = np.random.default_rng(0)
    site, at, wafer = i % 9, i // 9 % 60, i // 540
    frame = {
        "mask": np.full(n, "GATE"),
        "reference": np.full(n, "ACTIVE"),
        "lot": np.char.add("L", (wafer // 12).astype(str)),
        "wafer": (wafer % 12).astype(str),
        "X": (at % 8 - 3.5) * 15,
        "Y": (at // 8 - 3.5) * 15,
        "x": (site % 3 - 1) * 6.0,
        "y": (site // 3 - 1) * 6.0,
        "dx": np.round(rng.normal(0, 10, n), 2),
        "dy": np.round(rng.normal(0, 10, n), 2),
    }
    pl.DataFrame(frame).write_csv(file)
    return str(file)


def cpu() -> float:
    used = resource.getrusage(resource.RUSAGE_SELF)
    return used.ru_utime + used.ru_stime


def test_the_fit_costs_a_few_times_what_reading_the_file_costs(tmp_path):
    file = write(tmp_path / "data.csv", 400_000)
    words = dict.fromkeys(("mask", "reference", "lot", "wafer"), pl.String)

    def read():
        pl.scan_csv(file, schema_overrides=words).collect(engine="streaming")

    def fit():
        ledger = Ledger()
        for rows in open_measurements(file, "nm").batches():
            ledger.add(Batch(rows.reading, rows.lot, rows.wafer, rows.positions, rows.overlay, rows.row))
        assert ledger.tallies[0].n == 400_000

    costs = []
    for work in (read, fit):
        work()  # the first time loads what is needed
        begin = cpu()
        work()
        costs.append(cpu() - begin)
    # About 4 on an idle and on a busy machine; processor time, so that others at work do not count.
    assert costs[1] / costs[0] < 8


def held(file: str, at_once: int) -> tuple[int, int]:
    """Return the rows of the largest batch, and the most memory that numpy held [bytes]."""
    ledger, largest = Ledger(), 0
    tracemalloc.start()
    try:
        for rows in open_measurements(file, "nm", rows_at_once=at_once).batches():
            ledger.add(Batch(rows.reading, rows.lot, rows.wafer, rows.positions, rows.overlay, rows.row))
            largest = max(largest, len(rows.row))
            del rows
        return largest, tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()


def test_memory_follows_the_rows_held_together_and_not_the_file(tmp_path):
    small, large = (write(tmp_path / f"{n}.csv", n) for n in (108_000, 432_000))
    (rows_small, bytes_small), (rows_large, bytes_large) = (held(file, 54_000) for file in (small, large))
    # Wafers fall into batches by their hash: 100 of them on average, of 540 rows each.
    assert max(rows_small, rows_large) < 1.5 * 54_000
    assert bytes_large / rows_large < 1.3 * bytes_small / rows_small
    # A part is the same however few rows are held: the rows from which the shared pattern is found.
    assert held(large, 10**9)[1] > 2 * bytes_large

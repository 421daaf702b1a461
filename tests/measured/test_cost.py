"""What measured data cost: a small multiple of reading the file, in memory that does not grow with it."""

import resource
import subprocess
import sys
from pathlib import Path

import numpy as np
import polars as pl
import pytest

WORK = """
import resource, sys
from flowplan.engine.measured.batch import Batch
from flowplan.engine.measured.tally import Ledger
from flowplan.files.measurements import open_measurements
data = open_measurements(sys.argv[1], "nm", rows_at_once=int(sys.argv[2]))
ledger = Ledger()
n = 0
for rows in data.batches():
    ledger.add(Batch(rows.reading, rows.lot, rows.wafer, rows.positions, rows.overlay, rows.row))
    n += len(rows.row)
    del rows
print(n, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss // 1024)
"""


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
    from flowplan.engine.measured.batch import Batch
    from flowplan.engine.measured.tally import Ledger
    from flowplan.files.measurements import open_measurements

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


@pytest.mark.slow
def test_memory_follows_the_rows_held_together_and_not_the_file(tmp_path):
    n = 2_000_000
    file = write(tmp_path / "data.csv", n)
    peaks = []
    for at_once in (200_000, n):
        command = [sys.executable, "-c", WORK, file, str(at_once)]
        done = subprocess.run(command, capture_output=True, text=True, check=True)
        rows, peak = map(int, done.stdout.split())
        assert rows == n
        peaks.append(peak)
    # What polars holds in flight while it reads is the same for both.
    assert peaks[0] < 0.75 * peaks[1]

"""Measured rows for tests, without a file."""

import numpy as np

from flowplan.engine.measured.batch import Batch
from flowplan.engine.measured.tally import Ledger, Tally


def batch(overlay, positions=None, *, reading=0, lot=0, wafer=0) -> Batch:
    """Return a batch; what is given once counts for every row."""
    overlay = np.asarray(overlay, dtype=float)
    n = len(overlay)
    places = np.zeros((n, 4)) if positions is None else np.asarray(positions, dtype=float)
    numbers = [np.broadcast_to(np.asarray(v, dtype=np.int64), n).copy() for v in (reading, lot, wafer)]
    return Batch(*numbers, places, overlay, np.arange(n))


def tally_of(rows: Batch, limit=None) -> Tally:
    """Return the sums of rows of one reading."""
    ledger = Ledger(limit)
    ledger.add(rows)
    (tally,) = ledger.tallies.values()
    return tally


def grid(half_fields, pitch, half_site):
    """Return places X, Y, x, y of a square of fields with 3 x 3 sites each."""
    centres = np.arange(-half_fields, half_fields + 1) * pitch
    sites = np.array([-1.0, 0.0, 1.0]) * half_site
    return np.array([(X, Y, x, y) for Y in centres for X in centres for y in sites for x in sites])

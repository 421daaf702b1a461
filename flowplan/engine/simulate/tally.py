"""What is kept of a simulation while it runs: counts, whatever the number of samples."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray, IntArray

#: Bins between the ends of a residual's range.
BINS = 2048
#: Rows sorted into their bins at once.
_ROWS = 64


@dataclass(frozen=True, slots=True)
class Histogram:
    """How often a residual fell into each of many equal bins.

    Attributes
    ----------
    low, width : float
        Where the first bin begins, and the width of each [nm]. The end bins hold what lies beyond.
    counts : ndarray of int, shape (n_bins,)
        How often.
    """

    low: float
    width: float
    counts: IntArray

    def quantile(self, share: float) -> float:
        """Return the residual that a share of the samples stays below [nm].

        Linear within a bin, so it is off by less than a bin's width. A residual that does not vary
        has bins of width 0.
        """
        below = np.concatenate([[0], np.cumsum(self.counts)])
        wanted = share * below[-1]
        i = min(int(np.searchsorted(below, wanted, side="right")) - 1, len(self.counts) - 1)
        i = i if self.counts[i] else int(np.flatnonzero(self.counts)[-1])  # at the upper end
        inside = (wanted - float(below[i])) / float(self.counts[i])
        return float(self.low + self.width * (i + inside))

    @property
    def mean(self) -> float:
        """Mean residual [nm], to a small part of a bin."""
        return self.low + self.width * float(self._middles @ self.counts) / float(self.counts.sum())

    @property
    def deviation(self) -> float:
        """Standard deviation [nm], less what the bins' width adds (Sheppard)."""
        total = float(self.counts.sum())
        mean = float(self._middles @ self.counts) / total
        variance = float((self._middles - mean) ** 2 @ self.counts) / total - 1 / 12
        return self.width * float(np.sqrt(max(0.0, variance)))

    @property
    def _middles(self) -> FloatArray:
        return np.arange(len(self.counts), dtype=np.float64) + 0.5


@dataclass(frozen=True, slots=True)
class Range:
    """The ranges of the histograms: where each row's begins and how wide a bin is [nm]."""

    low: FloatArray
    width: FloatArray


class PairTally:
    """Counts of the judged rows over blocks of samples.

    Parameters
    ----------
    ranges : Range
        The histograms' ranges.
    """

    def __init__(self, ranges: Range) -> None:
        self._low = ranges.low[:, None]
        self._per_bin = np.divide(1.0, ranges.width, out=np.zeros_like(ranges.width), where=ranges.width > 0)[
            :, None
        ]
        self._first = (np.arange(_ROWS, dtype=np.int64) * BINS)[:, None]
        self.fails = np.zeros(len(ranges.low), dtype=np.int64)
        self.counts = np.zeros((len(ranges.low), BINS), dtype=np.int64)
        self.good = 0

    def add(self, left: FloatArray) -> None:
        """Add what is left beyond what must be kept [nm], shape (n_rows, n); uses up the array."""
        bad = left < 0
        self.fails += np.count_nonzero(bad, axis=1)
        self.good += int(bad.shape[1] - np.count_nonzero(bad.any(axis=0)))
        left -= self._low
        left *= self._per_bin
        np.clip(left, 0, BINS - 1, out=left)
        for start in range(0, len(left), _ROWS):
            counts = self.counts[start : start + _ROWS]
            place = left[start : start + _ROWS].astype(np.int64)
            place += self._first[: len(place)]
            counts += np.bincount(place.reshape(-1), minlength=counts.size).reshape(counts.shape)

    def merge(self, other: "PairTally") -> None:
        """Add another tally's counts."""
        self.fails += other.fails
        self.counts += other.counts
        self.good += other.good

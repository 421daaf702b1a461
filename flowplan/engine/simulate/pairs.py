"""The judged pairs at their worst points, in independent draws of every source."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.simulate.draws import Draws, Product, block_of, draws_of, generator
from flowplan.engine.simulate.forms import PairForms
from flowplan.engine.simulate.tally import BINS, PairTally, Range
from flowplan.engine.simulate.threads import Progress, spread
from flowplan.engine.sources import FloatArray, Source

#: Stream of random numbers, see `generator`.
_STREAM = 0
#: Standard deviations that a histogram reaches; what is drawn beyond counts in its end bin.
_REACH = 7.0
#: Counts of all threads' histograms together; more threads than hold them do not help.
_MOST_COUNTS = 2**25


@dataclass(frozen=True, slots=True)
class PairModel:
    """Evaluates what is left of each row's room beyond what must be kept.

    Attributes
    ----------
    forms : PairForms
        Offsets and rooms.
    draws : Draws
        The scalars; their forms are the rows' e, then the rows' E.
    products : tuple of (slice, Product, Product)
        Rows of one axis with their e and E.
    """

    forms: PairForms
    draws: Draws
    products: tuple[tuple[slice, Product, Product], ...]

    @classmethod
    def of(
        cls, forms: PairForms, sources: Sequence[Source], sigma: float, *, bounds_vary: bool
    ) -> "PairModel":
        """Return the model of some rows; arguments as for `draws_of`."""
        stacked = np.concatenate([forms.overlay, forms.edges])
        draws = draws_of(stacked, sources, sigma, bounds_vary=bounds_vary)
        n = len(forms.room)
        products = tuple(
            (rows, draws.product(rows), draws.product(slice(n + rows.start, n + rows.stop)))
            for rows in forms.axes
        )
        return cls(forms, draws, products)

    @property
    def n_rows(self) -> int:
        """Number of rows."""
        return len(self.forms.room)

    def parts(self, drawn: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the varying parts of e and of E [nm], each of shape (n_rows, n)."""
        overlay, edges = (np.empty((self.n_rows, drawn.shape[1])) for _ in range(2))
        for rows, of_overlay, of_edges in self.products:
            overlay[rows] = of_overlay.of(drawn)
            edges[rows] = of_edges.of(drawn)
        return overlay, edges

    def left(self, drawn: FloatArray) -> FloatArray:
        """Return room + E - |e| of every row [nm], shape (n_rows, n)."""
        overlay, edges = self.parts(drawn)
        overlay += self.forms.offset[:, None]
        np.abs(overlay, out=overlay)
        edges += self.forms.room[:, None]
        edges -= overlay
        return edges

    def ranges(self) -> Range:
        """Return where the histograms of what is left begin, and how wide their bins are [nm]."""
        overlay, edges = (
            self._reach(self.draws.forms[: self.n_rows]),
            self._reach(self.draws.forms[self.n_rows :]),
        )
        offset = np.abs(self.forms.offset)
        low = self.forms.room - edges - offset - overlay
        high = self.forms.room + edges - np.maximum(0.0, offset - overlay)
        return Range(low, (high - low) / BINS)

    def _reach(self, forms: FloatArray) -> FloatArray:
        normal, flat = np.split(forms, [self.draws.n_normal], axis=1)
        return np.asarray(_REACH * np.sqrt((normal**2).sum(axis=1)) + np.abs(flat).sum(axis=1))


def simulate_pairs(
    model: PairModel, samples: int, seed: int, threads: int, progress: Progress | None = None
) -> PairTally:
    """Draw every source `samples` times and count which rows hold.

    Parameters
    ----------
    model : PairModel
        The rows.
    samples, seed, threads : int
        How often, from which seed, on how many threads; the threads do not change the answer.
    progress : callable, optional
        Called with (blocks done, blocks in all).
    """
    ranges, size = model.ranges(), block_of(model.n_rows)
    threads = min(threads, max(1, _MOST_COUNTS // (model.n_rows * BINS)))

    def work(tally: PairTally, block: int) -> None:
        n = min(size, samples - block * size)
        tally.add(model.left(model.draws.sample(generator(seed, _STREAM, block), n)))

    blocks = -(-samples // size)
    total, *others = spread(blocks, lambda: PairTally(ranges), work, threads, progress)
    for other in others:
        total.merge(other)
    return total

"""What is drawn: independent scalars of unit size, and the generator of each block.

Normal sources that act in the same proportion everywhere are drawn as one normal of their joint
size, which is the same distribution: all that one exposure adds to one mask on one axis is one draw.
A block's generator depends on the seed and on the block's number alone, so that the answer does not
depend on how blocks are spread over threads.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import FloatArray, IntArray, Source, deviation
from flowplan.model.terms import LEVELS, Kind, Level

#: Samples in a block, small enough for a processor's cache.
BLOCK = 2048
_LEAST_BLOCK = 256
#: Values of all rows together in a block.
_MOST_VALUES = 2**20
#: Relative differences of proportions that are rounding.
_SAME = 1e-11


def block_of(n_rows: int) -> int:
    """Return how many samples a block has, fewer where many rows would make its arrays large."""
    return min(BLOCK, max(_LEAST_BLOCK, _MOST_VALUES // max(1, n_rows)))


def generator(seed: int, *place: int) -> np.random.Generator:
    """Return the generator of one block.

    Parameters
    ----------
    seed : int
        The user's seed, not negative.
    *place : int
        What the block is for, and its number.
    """
    return np.random.Generator(np.random.PCG64(np.random.SeedSequence(seed, spawn_key=place)))


@dataclass(frozen=True, slots=True)
class Draws:
    """Independent scalars, normals first.

    Attributes
    ----------
    forms : ndarray, shape (n_forms, n_draws)
        What one unit of each scalar adds to each linear form [nm, or nm per mm].
    n_normal : int
        How many are normal with standard deviation 1; the rest is uniform over -1 to 1.
    level : ndarray of int, shape (n_draws,)
        How often each is redrawn, as an index of `LEVELS`.
    """

    forms: FloatArray
    n_normal: int
    level: IntArray

    @property
    def size(self) -> int:
        """Number of scalars."""
        return len(self.level)

    def sample(self, random: np.random.Generator, n: int) -> FloatArray:
        """Return n draws of every scalar, shape (n_draws, n)."""
        drawn = np.empty((self.size, n))
        random.standard_normal(out=drawn[: self.n_normal])
        random.random(out=drawn[self.n_normal :])
        drawn[self.n_normal :] *= 2
        drawn[self.n_normal :] -= 1
        return drawn

    def only(self, levels: Sequence[Level]) -> "Draws":
        """Return the scalars that are redrawn at some levels."""
        chosen = np.isin(self.level, [LEVELS.index(level) for level in levels])
        return Draws(self.forms[:, chosen], int(chosen[: self.n_normal].sum()), self.level[chosen])

    def product(self, rows: slice) -> "Product":
        """Return the forms of some rows, without the scalars that none of them has."""
        part = self.forms[rows]
        columns = np.flatnonzero(part.any(axis=0))
        return Product(np.ascontiguousarray(part[:, columns]), columns)


@dataclass(frozen=True, slots=True)
class Product:
    """Some linear forms over those scalars that they have."""

    matrix: FloatArray
    columns: IntArray

    def of(self, drawn: FloatArray) -> FloatArray:
        """Return the forms' values [nm], shape (n_forms, n)."""
        if not len(self.columns):
            return np.zeros((len(self.matrix), drawn.shape[1]))
        return np.asarray(self.matrix @ drawn[self.columns])


def draws_of(amounts: FloatArray, sources: Sequence[Source], sigma: float, *, bounds_vary: bool) -> Draws:
    """Return what has to be drawn for linear forms of the sources.

    Parameters
    ----------
    amounts : ndarray, shape (n_forms, n_sources)
        Amounts of every source at its quoted size [nm, or nm per mm].
    sources : sequence of Source
        The sources.
    sigma : float
        Standard deviations at which random sizes are quoted.
    bounds_vary : bool
        Whether a bound counts as uniform over its range; else it is not drawn.
    """
    present = amounts.any(axis=0)
    level = np.array([LEVELS.index(s.varies) for s in sources], dtype=np.int64)
    normal = np.flatnonzero(present & _is(sources, "random"))
    flat = np.flatnonzero(present & (_is(sources, "uniform") | (_is(sources, "bound") & bounds_vary)))
    columns, levels = _together(amounts[:, normal] * deviation("random", sigma), level[normal])
    return Draws(
        np.concatenate([columns, amounts[:, flat]], axis=1),
        columns.shape[1],
        np.concatenate([levels, level[flat]]),
    )


def _is(sources: Sequence[Source], kind: Kind) -> np.ndarray:
    return np.array([s.kind == kind for s in sources], dtype=bool)


def _together(columns: FloatArray, level: IntArray) -> tuple[FloatArray, IntArray]:
    """Join columns of one level that are proportional: their sizes add up as variances.

    Columns are brought to one scale and told apart by two random projections, so that long columns
    cost no more than to read them; what falls together by chance alone stays apart.
    """
    if not columns.shape[1]:
        return columns, level
    size = np.abs(columns).max(axis=0)
    lead = (np.abs(columns) >= size * (1 - _SAME)).argmax(axis=0)
    scale = columns[lead, np.arange(len(lead))]
    shape = columns / scale
    marks = np.random.default_rng(0).standard_normal((2, len(columns))) @ shape
    keys = np.vstack([np.round(marks / _SAME**0.5), level, lead])
    _, first, place = np.unique(keys, axis=1, return_index=True, return_inverse=True)
    joined = first[place.reshape(-1)]
    alone = np.abs(shape - shape[:, joined]).max(axis=0) > _SAME
    joined[alone] = np.flatnonzero(alone)
    kept = np.unique(joined)
    variance = np.bincount(joined, weights=scale**2, minlength=len(scale))[kept]
    return shape[:, kept] * np.sqrt(variance), level[kept]

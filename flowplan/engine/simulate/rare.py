"""Fail fractions far too small to be counted, by importance sampling.

Draws come from a mixture of tilted densities, one a side of a row, and each draw x that fails counts
``f(x) / q(x)`` with q the density of the whole mixture (the balance heuristic, Veach and Guibas 1995):

    fail = mean of  1{some side fails} / sum_j a_j exp(theta_j L_j(x) - K_j)

which is exact on average whatever the shares a_j, and has a small relative error when they are near
the sides' own fail fractions. For one row the mixture has two components; for the union of all rows
two a row, and a component without a tilt that keeps every weight small.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.simulate.draws import BLOCK, generator
from flowplan.engine.simulate.pairs import PairModel
from flowplan.engine.simulate.results import Rare
from flowplan.engine.simulate.threads import Progress, spread
from flowplan.engine.simulate.tilt import Tilts, tilted_uniform, tilts_of
from flowplan.engine.sources import FloatArray

_OF_PAIRS, _OF_UNION = 2, 3
#: Samples of one row's estimate and of the union's.
ROW_SAMPLES, UNION_SAMPLES = 6000, 10 * BLOCK
#: Share of the union's draws without a tilt.
_PLAIN = 0.05
#: Sides less likely than this share of the likeliest are left out: all of a large flow's together are
#: far below the sampling error.
_SMALLEST = 1e-9


@dataclass(frozen=True, slots=True)
class _Sides:
    """Both sides of every row: L = -(E + s e), s = +1 for the first half of the sides and -1 after.

    Attributes
    ----------
    forms : ndarray, shape (n_sides, n_draws)
        L by scalar [nm].
    room : ndarray, shape (n_sides,)
        Room [nm].
    """

    forms: FloatArray
    room: FloatArray

    @classmethod
    def of(cls, model: PairModel) -> "_Sides":
        overlay, edges = np.split(model.draws.forms, 2)
        offset, room = model.forms.offset, model.forms.room
        return cls(
            np.concatenate([-(edges + overlay), -(edges - overlay)]),
            np.concatenate([room + offset, room - offset]),
        )

    def tilts(self, n_normal: int) -> Tilts:
        normal, flat = np.split(self.forms, [n_normal], axis=1)
        return tilts_of((normal**2).sum(axis=1), flat, self.room)


def rare_pairs(model: PairModel, seed: int, threads: int, progress: Progress | None = None) -> list[Rare]:
    """Return the fail fraction of every row, each from its own draws.

    Parameters
    ----------
    model : PairModel
        The rows.
    seed, threads, progress
        As for `simulate_pairs`.
    """
    sides = _Sides.of(model)
    tilts = sides.tilts(model.draws.n_normal)
    n = model.n_rows
    found: list[Rare] = [Rare(0.0, None)] * n

    def work(_: None, row: int) -> None:
        found[row] = _rare_row(model, sides, tilts, row, generator(seed, _OF_PAIRS, row))

    spread(n, lambda: None, work, threads, progress)
    return found


def _rare_row(model: PairModel, sides: _Sides, tilts: Tilts, row: int, random: np.random.Generator) -> Rare:
    """Estimate one row from its normal parts, joined to one of e and one of E, and its uniforms."""
    both = np.array([row, row + model.n_rows])
    if not sides.forms[both].any():
        return Rare(1.0, 0.0) if (sides.room[both] < 0).any() else Rare(0.0, None)
    chance = tilts.chance[both]
    if not chance.any():
        return Rare(0.0, None)
    kept = both[chance >= _SMALLEST * chance.max()]
    k = model.draws.n_normal
    overlay, edges = model.draws.forms[row], model.draws.forms[row + model.n_rows]
    flat = np.flatnonzero(sides.forms[kept, k:].any(axis=0)) + k
    joined = np.diag([np.hypot.reduce(overlay[:k]), np.hypot.reduce(edges[:k])])
    of_overlay, of_edges = np.concatenate([joined, np.stack([overlay[flat], edges[flat]])], axis=1)
    sign = np.where(kept < model.n_rows, 1.0, -1.0)[:, None]
    mixture = _Mixture(
        forms=-(of_edges + sign * of_overlay),
        theta=tilts.theta[kept],
        log_mean=tilts.log_mean[kept],
        room=sides.room[kept],
        shares=tilts.chance[kept] / tilts.chance[kept].sum(),
        plain=0.0,
        n_normal=2,
    )
    return _estimate(*mixture.moments(random, ROW_SAMPLES), ROW_SAMPLES)


def rare_union(model: PairModel, pairs: list[Rare], seed: int, threads: int) -> Rare:
    """Return the fraction in which some row fails.

    Parameters
    ----------
    model : PairModel
        The rows.
    pairs : list of Rare
        The rows' own fractions; a row that always fails settles the answer.
    seed, threads
        As for `simulate_pairs`.
    """
    if any(pair.fail == 1.0 and pair.relative_error == 0.0 for pair in pairs):
        return Rare(1.0, 0.0)
    sides = _Sides.of(model)
    tilts = sides.tilts(model.draws.n_normal)
    known = np.tile([pair.fail for pair in pairs], 2)
    split = tilts.chance.reshape(2, -1)
    total = split.sum(axis=0)
    own = np.divide(split, total, out=np.zeros_like(split), where=total > 0).reshape(-1)
    shares = known * own
    if not shares.any():
        return Rare(0.0, None)
    kept = np.flatnonzero(shares >= _SMALLEST * shares.max())
    mixture = _Mixture(
        sides.forms[kept],
        tilts.theta[kept],
        tilts.log_mean[kept],
        sides.room[kept],
        (1 - _PLAIN) * shares[kept] / shares[kept].sum(),
        _PLAIN,
        model.draws.n_normal,
    )
    blocks = UNION_SAMPLES // BLOCK
    sums = np.zeros((blocks, 2))

    def work(_: None, block: int) -> None:
        sums[block] = mixture.moments(generator(seed, _OF_UNION, block), BLOCK)

    spread(blocks, lambda: None, work, threads)
    first, second = sums.sum(axis=0)
    return _estimate(float(first), float(second), UNION_SAMPLES)


@dataclass(frozen=True, slots=True)
class _Mixture:
    """Tilted densities in shares, one a side that may fail.

    Attributes
    ----------
    forms, room
        As in `_Sides`, for the sides that are looked at.
    theta, log_mean : ndarray, shape (n_sides,)
        Their tilts.
    shares : ndarray, shape (n_sides,)
        Their shares; with `plain`, the share without a tilt, they add up to 1.
    n_normal : int
        How many of the scalars are normal.
    """

    forms: FloatArray
    theta: FloatArray
    log_mean: FloatArray
    room: FloatArray
    shares: FloatArray
    plain: float
    n_normal: int

    def moments(self, random: np.random.Generator, n: int) -> tuple[float, float]:
        """Return the sums of the weights and of their squares over n draws."""
        k, n_tilts = self.n_normal, len(self.theta)
        chosen = random.choice(n_tilts + 1, size=n, p=np.append(self.shares, self.plain))
        tilts = np.vstack([self.theta[:, None] * self.forms[:n_tilts], np.zeros((1, self.forms.shape[1]))])[
            chosen
        ]
        drawn = np.empty((n, self.forms.shape[1]))
        drawn[:, :k] = random.standard_normal((n, k)) + tilts[:, :k]
        drawn[:, k:] = tilted_uniform(random.random((n, drawn.shape[1] - k)), tilts[:, k:])
        values = drawn @ self.forms.T
        failing = (values > self.room).any(axis=1)
        exponent = values[failing] * self.theta - self.log_mean
        with np.errstate(over="ignore"):
            density = np.exp(exponent) @ self.shares + self.plain
        weights = 1 / density
        return float(weights.sum()), float((weights**2).sum())


def _estimate(first: float, second: float, n: int) -> Rare:
    mean = first / n
    if mean == 0:
        return Rare(0.0, None)
    variance = max(0.0, second / n - mean**2) / n
    error = max(1 / n, variance**0.5 / mean)  # draws that all fail leave room for one that does not
    return Rare(min(1.0, mean), error)

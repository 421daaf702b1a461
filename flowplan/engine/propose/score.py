"""Which of two outcomes is better, and what groups of pairs can reach together.

A score is a list of numbers; the first that differs decides, and more is better:

    worst   the margins from the smallest up
    fails   minus the number of failing pairs, then the margins from the smallest up
    yield   the sum of log(1 - fail probability)

Each of these orders stays the same when the pairs of two groups are put together, so every group may
take its own best and the whole is still bounded. Pairs with the same pivot form a group: they share
its choice.

Margins are equal when they differ by no more than 1e-9 of the largest drawn dimension, sums of
logarithms when they differ by no more than 1e-10, a tenth of a part per billion of the yield: far above
the rounding of the arithmetic and far below what matters on a wafer.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from flowplan.engine.sources import BoolArray, FloatArray, IntArray

Goal = Literal["worst", "fails", "yield"]
GOALS: tuple[Goal, ...] = ("worst", "fails", "yield")

#: Stands for a place that no pair takes.
_PADDING = 1e300
#: Figures closer than this share of the largest drawn dimension are equal.
_SAME = 1e-9
#: Sums of logarithms closer than this are equal.
_SAME_YIELD = 1e-10


@dataclass(frozen=True, slots=True)
class Scale:
    """How outcomes are compared.

    Attributes
    ----------
    goal : {'worst', 'fails', 'yield'}
        What is wanted.
    same : float
        Margins [nm], or sums of logarithms, that differ by no more are equal.
    """

    goal: Goal
    same: float

    @classmethod
    def of(cls, goal: Goal, largest: float) -> "Scale":
        """Return the scale for pairs of which the largest is drawn this wide [nm]."""
        return cls(goal, _SAME_YIELD if goal == "yield" else _SAME * largest)

    def scores(self, values: FloatArray) -> FloatArray:
        """Return the scores of outcomes, shape (n_outcomes, n_figures); `values` by pair."""
        if self.goal == "yield":
            return np.asarray(values.sum(axis=-1, keepdims=True))
        ordered = np.sort(values, axis=-1)
        if self.goal == "worst":
            return ordered
        return np.concatenate([-self.fails(values)[..., None], ordered], axis=-1)

    def fails(self, values: FloatArray) -> FloatArray:
        """Return how many margins are below 0."""
        return np.asarray((values < 0).sum(axis=-1), dtype=np.float64)

    def apart(self, one: FloatArray, other: FloatArray) -> BoolArray:
        """Return which figures, or values of pairs, differ by more than rounding."""
        with np.errstate(invalid="ignore"):
            return np.asarray(np.abs(one - other) > self.same)

    def compare(self, scores: FloatArray, other: FloatArray) -> IntArray:
        """Return for each score 1 where it is better than the other, 0 where equal, -1 where worse."""
        with np.errstate(invalid="ignore"):
            difference = scores - other
        apart = self.apart(scores, other)
        first = apart.argmax(axis=-1)[..., None]
        signs = np.where(apart, np.sign(difference), 0)
        return np.take_along_axis(signs, first, -1)[..., 0].astype(np.int64)


class Groups:
    """Pairs of nodes by the variable of their pivot.

    Parameters
    ----------
    values : ndarray, shape (n_nodes, n_rows, n_options)
        What each pair reaches at best with each option of its pivot.
    pivots : ndarray of int, shape (n_nodes, n_rows)
        The variables.
    n_variables : int
        How many there are.
    scale : Scale
        How outcomes are compared.
    """

    def __init__(self, values: FloatArray, pivots: IntArray, n_variables: int, scale: Scale) -> None:
        self.scale = scale
        order = np.argsort(pivots, axis=1, kind="stable")
        ordered = np.take_along_axis(pivots, order, axis=1)
        count = np.arange(ordered.shape[1])
        starts = np.where(np.diff(ordered, axis=1, prepend=-1) != 0, count, 0)
        place = count - np.maximum.accumulate(starts, axis=1)
        node = np.arange(len(values))[:, None]
        nothing = 0.0 if scale.goal == "yield" else np.inf
        self.values = np.full((len(values), n_variables, values.shape[2], place.max() + 1), nothing)
        self.values[node, ordered, :, place] = values[node, order]

    def best(self, allowed: BoolArray) -> BoolArray:
        """Return the best options, shape (n_nodes, n_variables, n_options); several on a tie.

        Parameters
        ----------
        allowed : ndarray of bool, shape (n_nodes, n_variables, n_options)
            The options left; at least one for each variable.
        """
        grouped = self.values
        if self.scale.goal == "yield":
            total = np.where(allowed, grouped.sum(axis=3), -np.inf)
            return np.asarray(total >= total.max(axis=2, keepdims=True))
        alive = allowed.copy()
        if self.scale.goal == "fails":
            failing = np.where(alive, self.scale.fails(grouped), np.inf)
            alive &= failing == failing.min(axis=2, keepdims=True)
        ordered = np.sort(grouped, axis=3)
        for k in range(ordered.shape[3]):
            figure = np.where(alive, np.minimum(ordered[..., k], _PADDING), -np.inf)
            alive &= figure >= figure.max(axis=2, keepdims=True) - self.scale.same
        return alive

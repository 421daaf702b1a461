"""Which of two outcomes is better, and the best that groups of pairs can reach together.

A score is a list of numbers; the first that differs decides, and more is better:

    worst   the margins from the smallest up
    fails   minus the number of failing pairs, then the margins from the smallest up
    yield   the sum of log(1 - fail probability)

Each of these orders stays the same when the pairs of two groups are put together, so every group may
take its own best and the whole is still bounded. Pairs with the same later mask form a group: they
share its choice.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from flowplan.engine.sources import FloatArray, IntArray

Goal = Literal["worst", "fails", "yield"]
GOALS: tuple[Goal, ...] = ("worst", "fails", "yield")

#: Figures closer than this share of the largest drawn dimension are equal.
_SAME = 1e-9


@dataclass(frozen=True, slots=True)
class Scale:
    """How outcomes are compared.

    Attributes
    ----------
    goal : {'worst', 'fails', 'yield'}
        What is wanted.
    same : float
        Figures that differ by no more are equal.
    """

    goal: Goal
    same: float

    @classmethod
    def of(cls, goal: Goal, largest: float) -> "Scale":
        """Return the scale for pairs of which the largest is drawn this wide [nm]."""
        return cls(goal, _SAME if goal == "yield" else _SAME * max(largest, 1.0))

    def scores(self, values: FloatArray) -> FloatArray:
        """Return the scores of outcomes, shape (n_outcomes, n_figures); `values` by pair."""
        if self.goal == "yield":
            return values.sum(axis=-1, keepdims=True)
        ordered = np.sort(values, axis=-1)
        if self.goal == "worst":
            return ordered
        return np.concatenate([-self.fails(values)[..., None], ordered], axis=-1)

    def fails(self, values: FloatArray) -> FloatArray:
        """Return how many margins are below 0."""
        return np.asarray((values < -self.same).sum(axis=-1), dtype=np.float64)

    def compare(self, scores: FloatArray, other: FloatArray) -> IntArray:
        """Return for each score 1 where it is better than the other, 0 where equal, -1 where worse."""
        difference = scores - other
        apart = np.abs(difference) > self.same
        if not apart.shape[-1]:
            return np.zeros(len(scores), dtype=np.int64)
        first = apart.argmax(axis=-1)[..., None]
        return np.take_along_axis(np.where(apart, np.sign(difference), 0), first, -1)[..., 0].astype(np.int64)


class Groups:
    """Pairs by the variable of their later mask.

    Parameters
    ----------
    variable : ndarray of int, shape (n_rows,)
        The variable on which each row's value is given by option.
    n_variables : int
        How many there are.
    scale : Scale
        How outcomes are compared.
    """

    def __init__(self, variable: IntArray, n_variables: int, scale: Scale) -> None:
        self.variable, self.scale = variable, scale
        self.used = np.unique(variable)
        rows = [np.flatnonzero(variable == v) for v in self.used]
        width = max((len(r) for r in rows), default=0)
        self._rows = np.full((len(rows), width), len(variable), dtype=np.int64)
        for group, members in zip(self._rows, rows, strict=True):
            group[: len(members)] = members
        self._n_variables = n_variables

    def best(self, values: FloatArray, allowed: FloatArray) -> tuple[FloatArray, IntArray]:
        """Return the score that no plan exceeds and the option that reaches it in every group.

        Parameters
        ----------
        values : ndarray, shape (n_nodes, n_rows, n_options)
            What each pair reaches at best with each option of its later mask.
        allowed : ndarray of bool, shape (n_nodes, n_variables, n_options)
            The options left.

        Returns
        -------
        scores : ndarray, shape (n_nodes, n_figures)
            Bounds.
        options : ndarray of int, shape (n_nodes, n_variables)
            The first of the best options; for a variable without pairs the first allowed.
        """
        options = allowed.argmax(axis=2)
        padding = np.full((len(values), 1, values.shape[2]), 0.0 if self.scale.goal == "yield" else np.inf)
        grouped = np.concatenate([values, padding], axis=1)[:, self._rows].swapaxes(2, 3)
        alive = allowed[:, self.used].copy()
        if self.scale.goal == "yield":
            total = np.where(alive, grouped.sum(axis=3), -np.inf)
            alive = total >= total.max(axis=2, keepdims=True) - self.scale.same
            options[:, self.used] = alive.argmax(axis=2)
            return total.max(axis=2).sum(axis=1, keepdims=True), options
        fails = np.zeros(len(values))
        if self.scale.goal == "fails":
            failing = np.where(alive, self.scale.fails(grouped), np.inf)
            fewest = failing.min(axis=2, keepdims=True)
            alive &= failing == fewest
            fails = fewest.sum(axis=(1, 2))
        reached = self._narrow(np.sort(grouped, axis=3), alive)
        options[:, self.used] = alive.argmax(axis=2)
        ordered = np.sort(reached.reshape(len(values), -1), axis=1)[:, : len(self.variable)]
        if self.scale.goal == "fails":
            ordered = np.concatenate([-fails[:, None], ordered], axis=1)
        return ordered, options

    def _narrow(self, ordered: FloatArray, alive: FloatArray) -> FloatArray:
        """Keep the options alive that are best figure by figure; return the figures reached."""
        reached = np.empty((*ordered.shape[:2], ordered.shape[3]))
        for k in range(ordered.shape[3]):
            figure = np.where(alive, ordered[..., k], -np.inf)
            reached[..., k] = figure.max(axis=2)
            with np.errstate(invalid="ignore"):
                alive &= figure >= reached[..., k, None] - self.scale.same
        return reached

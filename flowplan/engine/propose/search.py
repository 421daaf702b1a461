"""Branch and bound over the options of every mask, the most promising node first.

In a node every pair takes its best way through the options that are left. Where these ways agree they
are a plan, and the node is solved. Where they do not, the worst pair that the plan lets down decides:
the first mask at which its way leaves the plan is split into its options. Pairs far from the worst
thus cost nothing until the worst ones are settled.
"""

import heapq
from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import count

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.sources import FloatArray, IntArray

#: Nodes split at once; arrays of this many are cheaper than one by one.
_AT_ONCE = 8


@dataclass(frozen=True, slots=True)
class Best:
    """A plan with what it gives.

    Attributes
    ----------
    plan : ndarray of int, shape (n_variables,)
        The option of each variable.
    score : ndarray, shape (n_figures,)
        Its score.
    """

    plan: IntArray
    score: FloatArray


@dataclass(frozen=True, slots=True)
class Report:
    """How far a search has come: the best score, a score that no plan exceeds, share of the tree closed."""

    best: FloatArray
    bound: FloatArray
    closed: float


Watch = Callable[[Report], bool]


@dataclass(slots=True)
class Search:
    """A search for the best plan of a block.

    Attributes
    ----------
    block : Block
        The variables.
    best : Best
        The best plan so far, at first a good guess.
    limit : int or None
        Most masks that may change.
    watch : callable
        Told how far the search has come; answers whether to go on.
    """

    block: Block
    best: Best
    limit: int | None
    watch: Watch
    nodes: int = 0
    closed: float = 0.0
    _heap: list[tuple[tuple[float, ...], int, float, FloatArray]] = field(default_factory=list)
    _dive: list[tuple[tuple[float, ...], int, float, FloatArray]] = field(default_factory=list)
    _ticket: count = field(default_factory=count)

    def run(self, root: FloatArray) -> tuple[bool, FloatArray]:
        """Search all plans of a node.

        Parameters
        ----------
        root : ndarray of bool, shape (n_variables, n_options)
            The options left.

        Returns
        -------
        proved : bool
            Whether no plan is better than `best`.
        bound : ndarray, shape (n_figures,)
            A score that no plan exceeds.
        """
        self._push(root[None], np.array([1.0]))
        while self._heap or self._dive:
            if not self.watch(Report(self.best.score, self.bound, self.closed)):
                return False, self.bound
            self._split(*self._pop())
        return True, self.best.score

    @property
    def bound(self) -> FloatArray:
        """A score that no plan exceeds."""
        if not self._heap:
            return self.best.score
        top = -np.array(self._heap[0][0])
        return top if self._better(top[None])[0] else self.best.score

    def _better(self, scores: FloatArray) -> FloatArray:
        return self.block.scale.compare(scores, self.best.score) > 0

    def _push(self, allowed: FloatArray, weight: FloatArray) -> None:
        """Bound nodes and keep those that may hold something better."""
        self.nodes += len(allowed)
        kept, allowed = self._within_limit(allowed)
        self.closed += float(weight[~kept].sum())
        allowed, weight = allowed[kept], weight[kept]
        if not len(allowed):
            return
        bound = self.block.judge(allowed).bound
        better = self._better(bound)
        self.closed += float(weight[~better].sum())
        found = [
            (tuple((-bound[i]).tolist()), next(self._ticket), float(weight[i]), allowed[i])
            for i in np.flatnonzero(better)
        ]
        if found:
            dive = min(range(len(found)), key=lambda k: found[k][:2])
            self._dive.append(found.pop(dive))
        for node in found:
            heapq.heappush(self._heap, node)

    def _within_limit(self, allowed: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Tell which nodes keep to the limit; once it is reached, all other masks stay as they are."""
        if self.limit is None:
            return np.ones(len(allowed), dtype=bool), allowed
        forced = self.block.forced(allowed)
        used = forced.sum(axis=1)
        full = (used >= self.limit)[:, None] & ~forced
        allowed = allowed.copy()
        allowed[..., 1:] &= ~full[:, self.block.mask][..., None]
        return used <= self.limit, allowed

    def _pop(self) -> tuple[FloatArray, FloatArray]:
        taken, self._dive = self._dive, []
        taken += [heapq.heappop(self._heap) for _ in range(min(_AT_ONCE - len(taken), len(self._heap)))]
        return np.stack([allowed for *_, allowed in taken]), np.array([weight for _, _, weight, _ in taken])

    def _split(self, allowed: FloatArray, weight: FloatArray) -> None:
        judged = self.block.judge(allowed)
        plans = judged.options if self.limit is None else self._modest(allowed, judged.options)
        values = self.block.values(plans)
        scores = self.block.scale.scores(values)
        for plan, score in zip(plans, scores, strict=True):
            if self._better(score[None])[0]:
                self.best = Best(plan, score)
        left = self._better(judged.bound) & self._lets_down(judged.reach, values)
        self.closed += float(weight[~left].sum())
        if not left.any():
            return
        allowed, weight, plans = allowed[left], weight[left], plans[left]
        rows = self._critical(judged.reach[left], values[left])
        variables = self.block.departures(allowed, plans, rows)
        children, weights = [], []
        for node, share, variable in zip(allowed, weight, variables, strict=True):
            options = np.flatnonzero(node[variable])
            for option in options:
                child = node.copy()
                child[variable] = False
                child[variable, option] = True
                children.append(child)
                weights.append(share / len(options))
        self._push(np.stack(children), np.array(weights))

    def _modest(self, allowed: FloatArray, options: IntArray) -> IntArray:
        """Keep every mask as the file has it where that is allowed."""
        return np.where(allowed[..., 0], 0, options)

    def _lets_down(self, reach: FloatArray, values: FloatArray) -> FloatArray:
        return np.asarray((reach > values + self.block.scale.same).any(axis=1))

    def _critical(self, reach: FloatArray, values: FloatArray) -> IntArray:
        """Return the pair that decides next: the worst that the plan lets down."""
        gap = reach - values
        if self.block.as_yield:
            return gap.argmax(axis=1)
        return np.where(gap > self.block.scale.same, values, np.inf).argmin(axis=1)

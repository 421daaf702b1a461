"""The whole problem: both axes, one after the other where they do not depend on each other.

Each pair lies on one axis and each choice acts on one axis, so x and y are two problems, unless a mask
must take both from one candidate or only so many masks may change. Only ties need both: a mask counts
once, whichever axes change.
"""

import math
import time
from dataclasses import dataclass
from itertools import combinations, pairwise

import numpy as np

from flowplan.engine.propose.atoms import AxisAtoms
from flowplan.engine.propose.block import Block
from flowplan.engine.propose.clock import Clock
from flowplan.engine.propose.levels import Solver
from flowplan.engine.propose.prune import Best, Rules, narrow
from flowplan.engine.propose.score import Scale
from flowplan.engine.propose.search import Search
from flowplan.engine.sources import BoolArray, FloatArray, IntArray
from flowplan.model.base import AXES, Axis
from flowplan.model.candidates import Choice

#: Most sets of masks that are searched one by one when only so many masks may change.
_MOST_SETS = 2000


@dataclass(frozen=True, slots=True)
class Solution:
    """The best plan found.

    Attributes
    ----------
    plan : ndarray of int, shape (n_choices,)
        The option of each choice.
    score : ndarray, shape (n_figures,)
        What it gives.
    proved : bool
        Whether no plan is better.
    bound : ndarray, shape (n_figures,)
        A score whose first figure no plan exceeds.
    nodes : int
        Nodes bounded.
    closed : float
        Share of the tree that is settled.
    """

    plan: IntArray
    score: FloatArray
    proved: bool
    bound: FloatArray
    nodes: int
    closed: float


class Problem:
    """A flow's choices, ready to be solved under several limits.

    Parameters
    ----------
    atoms : dict of axis to AxisAtoms
        Both axes; at least one pair is judged.
    choices : tuple of Choice
        What every mask may read.
    scale : Scale
        How outcomes are compared.
    """

    def __init__(self, atoms: dict[Axis, AxisAtoms], choices: tuple[Choice, ...], scale: Scale) -> None:
        self.choices, self.scale = choices, scale
        self.judged = tuple(atoms[a] for a in AXES if len(atoms[a].rows.room))
        self.block = Block(self.judged, choices, scale)
        self.apart = all(len(choice.axes) == 1 for choice in choices) and len(self.judged) > 1

    def solve(self, clock: Clock, limit: int | None = None, start: IntArray | None = None) -> Solution:
        """Return the best plan.

        Parameters
        ----------
        clock : Clock
            Says when to stop.
        limit : int, optional
            Most masks that may change.
        start : ndarray of int, optional
            A plan within the limit to start from; the plan of the file when left out.
        """
        plan = np.zeros(len(self.choices), dtype=np.int64) if start is None else start
        best = Best.of(self.block, plan)
        free = self.block.free
        if limit is not None and limit < len(free):
            best = self._extended(best, limit)
            return self._together(clock, best, limit, self._sets(free, limit))
        if not self.apart:
            return self._together(clock, best, None, self.block.everything[None])
        solvers = [self._on_axis(clock, axis, plan) for axis in self.judged]
        self._take_turns(clock, solvers)
        for axis, solver in zip(self.judged, solvers, strict=True):
            plan = plan.copy()
            plan[self.block.variables[axis.axis]] = solver.best.plan
        best = self._fewer_changes(Best.of(self.block, plan))
        if any(solver.frontier for solver in solvers):
            bound = self._merged([solver.bound for solver in solvers])
            nodes, closed = sum(s.nodes for s in solvers), clock.closed
            return Solution(best.plan, best.score, False, bound, nodes, closed)
        root = self.block.everything
        for axis, solver in zip(self.judged, solvers, strict=True):
            root[self.block.variables[axis.axis]] &= self._as_good(solver)
        rows = np.cumsum([0, *(len(axis.rows.room) for axis in self.judged)])
        parts = tuple(slice(a, b) for a, b in pairwise(rows))
        reached = tuple((part, s.best.score) for part, s in zip(parts, solvers, strict=True))
        found = self._together(clock, best, None, root[None], reached)
        nodes = found.nodes + sum(s.nodes for s in solvers)
        return Solution(found.plan, found.score, found.proved, found.bound, nodes, found.closed)

    def _on_axis(self, clock: Clock, axis: AxisAtoms, plan: IntArray) -> Solver:
        choices = tuple(choice for choice in self.choices if axis.axis in choice.axes)
        block = Block((axis,), choices, self.scale)
        start = Best.of(block, plan[self.block.variables[axis.axis]])
        solver = Solver(block, start, Rules(None, "none"), clock)
        solver.start(block.everything[None])
        return solver

    def _take_turns(self, clock: Clock, solvers: list[Solver]) -> None:
        """Let both axes search in turn, so that neither is left behind when time runs out."""

        def tell() -> None:
            clock.best = self._figure(self._merged([solver.best.score for solver in solvers]))
            clock.bound = self._figure(self._merged([solver.bound for solver in solvers]))
            clock.closed = sum(solver.closed for solver in solvers) / len(solvers)

        for solver in solvers:
            solver.tell = tell
        tell()
        spent = [0.0 for _ in solvers]
        while any(solver.frontier for solver in solvers) and clock():
            turn = min((k for k, solver in enumerate(solvers) if solver.frontier), key=lambda k: spent[k])
            began = time.monotonic()
            solvers[turn].step()
            spent[turn] += time.monotonic() - began

    def _sets(self, free: IntArray, limit: int) -> BoolArray:
        """Return what is left when just these masks may change, for every set of the most that may.

        With all other masks decided, bounds are close. Where there are too many sets, all plans are
        one node.
        """
        if math.comb(len(free), limit) > _MOST_SETS:
            return self.block.everything[None]
        return np.stack([self._opened(np.zeros_like(self.block.count), s) for s in combinations(free, limit)])

    def _opened(self, plan: IntArray, masks: tuple[int, ...]) -> BoolArray:
        """Return all plans that differ from a plan in these masks alone, as a node."""
        opened = np.isin(self.block.mask, masks)[:, None]
        taken = np.arange(self.block.width) == plan[:, None]
        return np.where(opened, self.block.everything, taken)

    def _extended(self, best: Best, limit: int) -> Best:
        """Change one more mask at a time, each time the one that helps most, as far as that goes."""
        rules = Rules(None, "none")
        while best.changes < limit:
            nodes = np.stack([self._opened(best.plan, (int(mask),)) for mask in self.block.free])
            search = Search(self.block, best, rules, lambda _: True, np.zeros(len(best.plan)))
            search.narrowed(nodes, np.ones(len(nodes)))
            if not search.found:
                break
            best = search.best
        return best

    def _figure(self, score: FloatArray) -> float:
        return -float(score[0]) if self.scale.goal == "fails" else float(score[0])

    def _as_good(self, solver: Solver) -> BoolArray:
        """Return the options that plans as good as the best of an axis can take."""
        block, rules = solver.block, Rules(None, "keep")
        options = narrow(block, block.everything[None], solver.best, rules).allowed[0]
        allowed = np.zeros((len(options), self.block.width), dtype=bool)
        allowed[:, : options.shape[1]] = options
        return allowed

    def _together(
        self,
        clock: Clock,
        best: Best,
        limit: int | None,
        roots: BoolArray,
        parts: tuple[tuple[slice, FloatArray], ...] = (),
    ) -> Solution:
        solver = Solver(self.block, best, Rules(limit, "break", parts), clock)

        def tell() -> None:
            clock.best, clock.bound = self._figure(solver.best.score), self._figure(solver.bound)
            clock.closed = solver.closed

        solver.start(roots)
        solver.tell = tell
        tell()
        proved = solver.run()
        found = solver.best if proved else self._fewer_changes(solver.best)
        return Solution(found.plan, found.score, proved, solver.bound, solver.nodes, solver.closed)

    def _fewer_changes(self, best: Best) -> Best:
        """Take back changes, the last mask first, as long as nothing is lost."""
        for mask in reversed(np.flatnonzero(self.block.changed(best.plan[None])[0])):
            plan = np.where(self.block.mask == mask, 0, best.plan)
            found = Best.of(self.block, plan)
            if self.scale.compare(found.score, best.score) >= 0:
                best = found
        return best

    def _merged(self, scores: list[FloatArray]) -> FloatArray:
        """Return the score of pairs put together."""
        if self.scale.goal == "yield":
            return np.asarray(sum(scores))
        if self.scale.goal == "worst":
            return np.sort(np.concatenate(scores))
        margins = np.sort(np.concatenate([score[1:] for score in scores]))
        return np.concatenate([[sum(score[0] for score in scores)], margins])

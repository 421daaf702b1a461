"""The whole problem: both axes, one after the other where they do not depend on each other.

Each pair lies on one axis and each choice acts on one axis, so x and y are two problems, unless a mask
must take both from one candidate or only so many masks may change. Only ties need both: a mask counts
once, whichever axes change.
"""

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from flowplan.engine.propose.atoms import AxisAtoms
from flowplan.engine.propose.block import Block
from flowplan.engine.propose.clock import Clock
from flowplan.engine.propose.levels import Solver
from flowplan.engine.propose.prune import Best, Rules, narrow
from flowplan.engine.propose.score import Scale
from flowplan.engine.sources import BoolArray, FloatArray, IntArray
from flowplan.model.base import AXES, Axis
from flowplan.model.candidates import Choice

#: Seconds of the first turn of each axis; every round takes twice as long.
_FIRST_TURN = 4.0


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
        if limit is not None or not self.apart:
            return self._together(clock, best, limit, self.block.everything)
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
        found = self._together(clock, best, None, root, reached)
        nodes = found.nodes + sum(s.nodes for s in solvers)
        return Solution(found.plan, found.score, found.proved, found.bound, nodes, found.closed)

    def _on_axis(self, clock: Clock, axis: AxisAtoms, plan: IntArray) -> Solver:
        choices = tuple(choice for choice in self.choices if axis.axis in choice.axes)
        block = Block((axis,), choices, self.scale)
        start = Best.of(block, plan[self.block.variables[axis.axis]])
        solver = Solver(block, start, Rules(None, "none"), clock)
        solver.start(block.everything)
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
        turn = _FIRST_TURN
        while any(solver.frontier for solver in solvers) and not clock.stopped:
            for solver in solvers:
                clock.slice(turn)
                solver.run()
            turn *= 2
        clock.slice(math.inf)

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
        root: BoolArray,
        parts: tuple[tuple[slice, FloatArray], ...] = (),
    ) -> Solution:
        solver = Solver(self.block, best, Rules(limit, "break", parts), clock)

        def tell() -> None:
            clock.best, clock.bound = self._figure(solver.best.score), self._figure(solver.bound)
            clock.closed = solver.closed

        solver.start(root)
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

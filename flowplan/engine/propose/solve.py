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
from flowplan.engine.propose.worker import Report, Worker
from flowplan.engine.sources import BoolArray, FloatArray, IntArray
from flowplan.model.base import AXES, Axis
from flowplan.model.candidates import Choice

#: Most sets of masks that are searched one by one when only so many masks may change.
_MOST_SETS = 2000
#: Seconds of search after which a second process is worth its start.
_WORTH = 2.0
#: Seconds between two looks at what the second process tells.
_NAP = 0.02


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
    workers : int
        From 2 on, axes that can be searched apart are searched in two processes where it takes long.
    """

    def __init__(
        self, atoms: dict[Axis, AxisAtoms], choices: tuple[Choice, ...], scale: Scale, workers: int = 1
    ) -> None:
        self.choices, self.scale, self.workers = choices, scale, workers
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
        return self._apart(clock, plan)

    def _apart(self, clock: Clock, plan: IntArray) -> Solution:
        """Search each axis by itself, then both for the first among equals."""
        solvers = [self._on_axis(clock, axis, plan) for axis in self.judged]
        reports = self._take_turns(clock, solvers)
        for axis, report in zip(self.judged, reports, strict=True):
            plan = plan.copy()
            plan[self.block.variables[axis.axis]] = report.best.plan
        best = self._fewer_changes(Best.of(self.block, plan))
        nodes = sum(report.nodes for report in reports)
        if not all(report.done for report in reports):
            bound = self._merged([report.bound for report in reports])
            return Solution(best.plan, best.score, False, bound, nodes, clock.closed)
        root = self.block.everything
        for axis, solver, report in zip(self.judged, solvers, reports, strict=True):
            root[self.block.variables[axis.axis]] &= self._as_good(solver.block, report.best)
        rows = np.cumsum([0, *(len(axis.rows.room) for axis in self.judged)])
        parts = tuple(slice(a, b) for a, b in pairwise(rows))
        reached = tuple((part, r.best.score) for part, r in zip(parts, reports, strict=True))
        found = self._together(clock, best, None, root[None], reached)
        return Solution(found.plan, found.score, found.proved, found.bound, found.nodes + nodes, found.closed)

    def _on_axis(self, clock: Clock, axis: AxisAtoms, plan: IntArray) -> Solver:
        choices = tuple(choice for choice in self.choices if axis.axis in choice.axes)
        block = Block((axis,), choices, self.scale)
        start = Best.of(block, plan[self.block.variables[axis.axis]])
        solver = Solver(block, start, Rules(None, "none"), clock)
        solver.start(block.everything[None])
        return solver

    def _take_turns(self, clock: Clock, solvers: list[Solver]) -> list[Report]:
        """Let both axes search in turn, so that neither is left behind when time runs out."""
        reports = [Report.of(solver) for solver in solvers]
        spent, alone = [0.0 for _ in solvers], self.workers < 2
        self._tell(clock, reports)
        while clock() and not all(report.done for report in reports):
            if not (alone or any(report.done for report in reports)) and sum(spent) >= _WORTH:
                self._at_once(clock, solvers, reports)
                alone = True  # what a process left that died is searched here
                continue
            turn = min((k for k, r in enumerate(reports) if not r.done), key=lambda k: spent[k])
            began = time.monotonic()
            solvers[turn].step()
            reports[turn] = Report.of(solvers[turn])
            self._tell(clock, reports)
            spent[turn] += time.monotonic() - began
        return reports

    def _at_once(self, clock: Clock, solvers: list[Solver], reports: list[Report]) -> None:
        """Search the first axis here and the second in another process; update the reports in place."""
        mine, other = solvers
        try:
            worker = Worker(other)
        except OSError:
            return

        def tell() -> None:
            reports[:] = [Report.of(mine), worker.report]
            self._tell(clock, reports)

        mine.tell = tell
        try:
            mine.run()
            while worker.running and clock():
                time.sleep(_NAP)
                tell()
        finally:
            worker.end()
        tell()

    def _tell(self, clock: Clock, reports: list[Report]) -> None:
        clock.best = self._figure(self._merged([report.best.score for report in reports]))
        clock.bound = self._figure(self._merged([report.bound for report in reports]))
        clock.closed = sum(report.closed for report in reports) / len(reports)

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

    def _as_good(self, block: Block, best: Best) -> BoolArray:
        """Return the options that plans as good as the best of an axis can take."""
        options = narrow(block, block.everything[None], best, Rules(None, "keep")).allowed[0]
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

"""The best plan of a block, one figure of the score after the other.

What is found soon decides how much can be pruned. So before the tree is searched for anything better
than the best plan, short searches aim higher: halfway between the first figure in which the best plan
falls short of what the bound allows, and the bound. Each either finds a plan that good or shows that
there is none, and mostly fast: the higher the aim, the fewer options are left.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.climb import climb
from flowplan.engine.propose.prune import Best, Rules
from flowplan.engine.propose.search import Node, Search, Watch
from flowplan.engine.sources import BoolArray, FloatArray

#: Nodes after which an aim is given up.
_SHORT = 400
_FEW = 4
_HARD = 200
#: How far above the best an aim stands, as shares of the gap, tried in turn.
_AIMS = (0.5, 0.1)


@dataclass(slots=True)
class Solver:
    """Finds the best plan of a block and proves it.

    Attributes
    ----------
    block : Block
        The variables.
    best : Best
        The best plan so far.
    rules : Rules
        What is wanted.
    go_on : callable
        Asked whether to go on.
    nodes : int
        Nodes bounded.
    closed : float
        Share of the tree that is settled.
    bound : ndarray, shape (n_figures,)
        A score that no plan exceeds.
    """

    block: Block
    best: Best
    rules: Rules
    watch: Watch
    nodes: int = 0
    closed: float = 0.0
    frontier: list[Node] = ()

    def run(self, root: BoolArray) -> bool:
        """Search all plans of a node; return whether the best is proved."""
        top = np.full(len(self.best.score), np.inf)
        frontier, aims, hard = [Node(root, top, 1.0)], list(_AIMS), True
        while frontier and self.go_on():
            if hard and len(frontier) <= _FEW:
                frontier = self._shave(frontier)
                hard = False
                if not frontier:
                    break
            level = min(self._gap(node.bound) for node in frontier)
            print("   level", level, self.best.score[:3], len(frontier), (frontier[0].allowed.sum(1) > 1).sum(), self.nodes)
            bound = max(node.bound[level] for node in frontier) if level < len(top) else 0.0
            if aims and level < len(top) and self._aim(frontier, level, aims.pop(0), bound):
                aims, hard = list(_AIMS), level == 0
                continue
            if aims and level < len(top):
                continue
            search = Search(self.block, self.best, self.rules, self.watch)
            search.run(frontier, level=level)
            self._count(search)
            hard = True
            print("      settle", level, search.nodes, len(search.aside), search.found)
            self.best, frontier = search.best, search.left()
            aims = list(_AIMS)
        self.frontier = frontier
        return not frontier

    def _shave(self, frontier: list[Node]) -> list[Node]:
        left = []
        for node in frontier:
            search = Search(self.block, self.best, self.rules, self.watch)
            found = search.shave(node.allowed)
            self._count(search)
            self.best = search.best
            if found.alive[0]:
                left.append(Node(found.allowed[0], found.bound[0], node.weight))
        return left

    def go_on(self) -> bool:
        return self.watch(None)

    def _count(self, search: Search) -> None:
        self.nodes += search.nodes

    def _gap(self, bound: FloatArray) -> int:
        apart = np.abs(bound - self.best.score) > self.block.scale.same
        return int(apart.argmax()) if apart.any() else len(apart)

    def _aim(self, frontier: list[Node], level: int, share: float, bound: float) -> bool:
        """Look for a plan that reaches a target; return whether there is one."""
        target = np.full(len(self.best.score), -np.inf)
        target[:level] = self.best.score[:level]
        target[level] = self.best.score[level] + share * (bound - self.best.score[level])
        goal = Best(self.best.plan, target, self.best.changes)
        search = Search(self.block, goal, Rules(self.rules.limit, "none"), lambda s: s.nodes < _SHORT)
        ended = search.run(frontier, first=True)
        self._count(search)
        print("      aim", level, target[level], 'found' if search.found else ('none' if ended else 'gave up'), search.nodes)
        if search.found:
            self.best = search.best
        return search.found

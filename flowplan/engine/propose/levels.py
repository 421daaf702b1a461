"""The best plan of a block, one figure of the score after the other.

What is found soon decides how much can be pruned. So before the tree is searched for anything better
than the best plan, short searches aim higher: between the first figure in which the best plan falls
short of what the bound allows, and the bound. Each either finds a plan that good or shows that there is
none, and mostly fast: the higher the aim, the fewer options are left.
"""

import time
from dataclasses import dataclass, field

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.prune import Best, Rules, narrow
from flowplan.engine.propose.search import Node, Search, Watch, nodes_of
from flowplan.engine.sources import BoolArray, FloatArray

#: Nodes after which an aim is given up.
_SHORT = 150
_STEPS = 6
#: Open nodes of which each is shaved.
_FEW = 4
DEBUG = False


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
    watch : callable
        Asked whether to go on.
    nodes : int
        Nodes bounded.
    frontier : list of Node
        What is not settled.
    """

    block: Block
    best: Best
    rules: Rules
    watch: Watch
    nodes: int = 0
    weight: FloatArray = field(default_factory=lambda: np.zeros(0))
    frontier: list[Node] = field(default_factory=list)

    def run(self, root: BoolArray) -> bool:
        """Search all plans of a node; return whether the best is proved."""
        one = np.ones(1)
        self.weight = np.zeros(len(root))
        self.frontier = nodes_of(narrow(self.block, root[None], self.best, self.rules), one)
        while self.frontier and self.watch(self):
            if len(self.frontier) <= _FEW:
                self.frontier = self._shaved(self.best)
            if not self.frontier:
                break
            level = min(self._gap(node.bound) for node in self.frontier)
            if DEBUG: print("   level", level, self.best.score[:3], len(self.frontier), (self.frontier[0].allowed.sum(1) > 1).sum(), self.nodes)
            if level < len(self.best.score):
                self._aim(level)
            cap = 500
            while self.watch(self):
                search = Search(self.block, self.best, self.rules, lambda s: self.watch(self) and s.nodes < cap, self.weight)
                ended = search.run(self.frontier, level=level)
                self.nodes += search.nodes
                if ended or search.found: break
                cap*=2
            if DEBUG: print("      settle", level, search.nodes, len(search.aside), search.found)
            self.best, self.frontier = search.best, search.left()
        return not self.frontier

    def _shaved(self, best: Best) -> list[Node]:
        left = []
        for node in self.frontier:
            search = Search(self.block, best, self.rules, self.watch, self.weight)
            found = search.shave(node.allowed)
            self.nodes += search.nodes
            if search.found:
                self.best = search.best
            left += nodes_of(found, np.array([node.weight]))
        return left

    def _gap(self, bound: FloatArray) -> int:
        apart = np.abs(bound - self.best.score) > self.block.scale.same
        return int(apart.argmax()) if apart.any() else len(apart)

    def _aim(self, level: int) -> None:
        """Close in on the best figure at a level from both sides."""
        high = max(node.bound[level] for node in self.frontier)
        for step in range(_STEPS):
            low = self.best.score[level]
            if high - low <= self.block.scale.same:
                return
            aim = low + (high - low) * 0.5 if step < _STEPS - 1 else low
            target = np.full(len(self.best.score), -np.inf)
            target[:level], target[level] = self.best.score[:level], aim
            goal = Best(self.best.plan, target, self.best.changes)
            ended = False
            for cap in (60, 120, 240):
                search = Search(
                    self.block,
                    goal,
                    Rules(self.rules.limit, "none"),
                    lambda s, c=cap: s.nodes < c,
                    self.weight,
                )
                t = time.time()
                ended = search.run(self.frontier, first=True)
                self.nodes += search.nodes
                if DEBUG: print("      aim", level, aim, 'found' if search.found else ('none' if ended else 'gave up'), search.nodes, time.time() - t)
                if search.found or ended: break
            if search.found:
                self.best = search.best
            elif ended:
                high = aim
            else:
                return

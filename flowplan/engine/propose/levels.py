"""The best plan of a block, one figure of the score after the other.

What is found soon decides how much can be pruned. So before the tree is searched for anything better
than the best plan, short searches aim higher: between the first figure in which the best plan falls
short of what the bound allows, and the bound. Each either finds a plan that good or shows that there is
none, and mostly fast: the higher the aim, the fewer options are left. Then the tree is searched until
nothing is left that is better in that figure, and the next figure follows.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.climb import climb
from flowplan.engine.propose.clock import Clock
from flowplan.engine.propose.prune import Best, Rules
from flowplan.engine.propose.search import Node, Search, nodes_of
from flowplan.engine.sources import BoolArray, FloatArray

#: Aims taken at one figure.
_AIMS = 8
#: Nodes after which an aim is given up and started anew with what was learned, and at last given up.
_SHORT = (60, 120, 240)
#: Aims given up at one figure before the tree is searched.
_GIVE_UP = 2
#: Nodes after which the search of a level is started anew with what was learned; doubled each time.
_LONG = 500
#: Open nodes of which each is shaved.
_FEW = 4


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
    clock : Clock
        Asked whether to go on.
    nodes : int
        Nodes bounded.
    frontier : list of Node
        What is not settled.
    tell : callable
        Called whenever something new is known.
    """

    block: Block
    best: Best
    rules: Rules
    clock: Clock
    nodes: int = 0
    frontier: list[Node] = field(default_factory=list)
    tell: Callable[[], None] = lambda: None
    _failures: FloatArray = field(default_factory=lambda: np.zeros(0))
    _level: int | None = None
    _most: int = 0
    _better: bool = False

    def start(self, roots: BoolArray) -> None:
        """Begin with all plans of some nodes, shape (n_nodes, n_variables, n_options)."""
        self._failures = np.zeros(roots.shape[1])
        nodes = np.repeat(1 / len(roots), len(roots))
        search = self._search(self.best, np.inf)
        self.frontier = search.narrowed(roots, nodes)
        self.best = search.best

    def run(self) -> bool:
        """Search what is left until the clock says stop; return whether the best is proved."""
        while self.frontier and self.clock():
            self.step()
        return not self.frontier

    def step(self) -> None:
        """Search for a while: a part of the tree, sized by nodes."""
        if not self._most:
            if len(self.frontier) > _FEW:
                self._gather()
            else:
                self._shave()
            if self.frontier:
                level = self._lowest(self.frontier)
                self._level, self._most = (level if level < len(self.best.score) else None), _LONG
                if self._level is not None:
                    self._aim(self._level)
        if self.frontier:
            self._settle()
        self.tell()

    @property
    def bound(self) -> FloatArray:
        """A score that no plan exceeds."""
        bounds = [node.bound for node in self.frontier]
        top = max(bounds, key=lambda score: tuple(score.tolist()), default=self.best.score)
        return top if self.block.scale.compare(top, self.best.score) > 0 else self.best.score

    @property
    def closed(self) -> float:
        """Share of the tree that is settled."""
        return 1.0 - sum(node.weight for node in self.frontier)

    def _search(self, best: Best, most: float) -> Search:
        ties = self.rules if best is self.best else Rules(self.rules.limit, "none")
        before = self.nodes

        def go_on(search: Search) -> bool:
            self.clock.nodes += search.nodes - (self.nodes - before)
            self.nodes = before + search.nodes
            return search.nodes < most and self.clock()

        return Search(self.block, best, ties, go_on, self._failures)

    def _shave(self) -> None:
        left = []
        for node in self.frontier:
            search = self._search(self.best, np.inf)
            found = search.shave(node.allowed)
            self.best = search.best
            left += nodes_of(found, np.array([node.weight]))
        self.frontier = left

    def _gather(self) -> None:
        """Put all that is left into one node, where shaving makes up for what that gives away.

        It does where no figure is open again that was settled. What was found meanwhile prunes one node
        better than many. Sets of masks that may change stay apart.
        """
        if self.rules.limit is not None:
            return
        allowed, weight = _stacked(self.frontier)
        search = self._search(self.best, np.inf)
        whole = nodes_of(search.shave(np.asarray(allowed.any(axis=0))), weight.sum(keepdims=True))
        self.best = search.best
        if self._better or not whole or self._lowest(whole) >= self._lowest(self.frontier):
            self.frontier = whole

    def _lowest(self, nodes: list[Node]) -> int:
        return min(self._gap(node.bound) for node in nodes)

    def _gap(self, bound: FloatArray) -> int:
        apart = self.block.scale.apart(bound, self.best.score)
        return int(apart.argmax()) if apart.any() else len(apart)

    def _aim(self, level: int) -> None:
        """Close in on the best figure at a level from both sides."""
        high = max(node.bound[level] for node in self.frontier)
        share, given_up = 0.5, 0
        for k in range(_AIMS):
            low = self.best.score[level]
            if not self.block.scale.apart(high, low) or given_up > _GIVE_UP or not self.clock():
                return
            aim = low if k == _AIMS - 1 else low + share * (high - low)
            ended, better = self._try_aim(level, aim)
            if better is not None:
                self.best = climb(self.block, better, self.rules)
            elif ended:
                high = aim
            else:
                share, given_up = share / 2, given_up + 1

    def _try_aim(self, level: int, aim: float) -> tuple[bool, Best | None]:
        """Look for a plan that is better than an aim; tell whether the search came to an end."""
        target = np.full(len(self.best.score), -np.inf)
        target[:level], target[level] = self.best.score[:level], aim
        goal = Best(self.best.plan, target, self.best.changes)
        search = self._search(goal, np.inf)
        if len(self.frontier) <= _FEW:
            shaved = (nodes_of(search.shave(n.allowed), np.array([n.weight])) for n in self.frontier)
            roots = [node for nodes in shaved for node in nodes]
        else:
            roots = search.narrowed(*_stacked(self.frontier))
        if search.found:
            return False, search.best
        for most in _SHORT:
            search = self._search(goal, most)
            ended = search.run(roots, first=True)
            if search.found or ended:
                break
        return ended, search.best if search.found else None

    def _settle(self) -> None:
        """Search until all that is left can only be better in a figure after this one, or for a while."""
        search = self._search(self.best, self._most)
        ended = search.run(self.frontier, level=self._level)
        if not (ended or search.found) and self.clock():
            self._most *= 2
            return
        self._most = 0
        self.best, self.frontier = search.best, search.left()
        self._better = search.found


def _stacked(nodes: list[Node]) -> tuple[BoolArray, FloatArray]:
    return np.stack([node.allowed for node in nodes]), np.array([node.weight for node in nodes])

"""Branch and bound over the options of every mask, depth first, the most promising option first.

In a node every pair takes its best way through the options that are left. Where these ways agree they
are a plan, and the node is solved. Where they do not, the worst pair that the plan lets down decides:
a mask on its way is split into its options. Pairs far from the worst thus cost nothing until the worst
ones are settled.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.prune import Best, Narrowed, Rules, narrow
from flowplan.engine.sources import BoolArray, FloatArray, IntArray

#: Nodes tried at once while options are shaved off.
_AT_ONCE = 64
#: Nodes split at once.
_SPLIT = 12

#: Asked between nodes whether to go on.
Watch = Callable[["Search"], bool]


@dataclass(frozen=True, slots=True)
class Node:
    allowed: BoolArray
    bound: FloatArray
    weight: float


@dataclass(slots=True)
class Search:
    """A search for the best plan of a block.

    Attributes
    ----------
    block : Block
        The variables.
    best : Best
        What is to be beaten: the best plan so far, or a mere target.
    rules : Rules
        What is wanted.
    watch : callable
        Told how far the search has come; answers whether to go on.
    nodes : int
        Nodes bounded.
    closed : float
        Share of the tree that is settled.
    found : bool
        Whether anything was found that beats what was to be beaten.
    """

    block: Block
    best: Best
    rules: Rules
    watch: Watch
    nodes: int = 0
    closed: float = 0.0
    found: bool = False
    aside: list[Node] = field(default_factory=list)
    _stack: list[Node] = field(default_factory=list)

    def run(self, roots: list[Node], *, first: bool = False, level: int | None = None) -> bool:
        """Search all plans of some nodes.

        Parameters
        ----------
        roots : list of Node
            The nodes.
        first : bool
            Whether the first plan found is enough.
        level : int, optional
            Put nodes aside that can only be better in a later figure than this one.

        Returns
        -------
        bool
            Whether no plan is wanted more than `best`; False when the search ended early.
        """
        self._stack = list(reversed(roots))
        while self._stack:
            if (first and self.found) or not self.watch(self):
                return False
            top = self._stack[-_SPLIT:]
            del self._stack[-_SPLIT:]
            self._split(top, level)
        return True

    def left(self) -> list[Node]:
        """Return the nodes that are not settled."""
        return [*reversed(self._stack), *self.aside]

    @property
    def bound(self) -> FloatArray:
        """A score that no plan exceeds."""
        bounds = [node.bound for node in self._stack]
        return max([self.best.score, *bounds], key=lambda score: tuple(score.tolist()))

    def shave(self, allowed: BoolArray) -> Narrowed:
        """Try every option of every variable alone and drop those with which nothing is wanted.

        Returns
        -------
        Narrowed
            One node with the options left; not alive when nothing is wanted any more.
        """
        found = narrow(self.block, allowed[None], self.best, self.rules)
        while found.alive[0] and self.watch(self):
            self._take(found.options)
            left = self._shaved(found.allowed[0])
            if (left == found.allowed[0]).all():
                break
            found = narrow(self.block, left[None], self.best, self.rules)
        return found

    def _shaved(self, allowed: BoolArray) -> BoolArray:
        left = allowed.copy()
        variable, option = np.nonzero(allowed & (allowed.sum(axis=1) > 1)[:, None])
        for i in range(0, len(variable), _AT_ONCE):
            if not self.watch(self):
                break
            v, o = variable[i : i + _AT_ONCE], option[i : i + _AT_ONCE]
            trials = np.repeat(left[None], len(v), axis=0)
            trials[np.arange(len(v)), v] = False
            trials[np.arange(len(v)), v, o] = left[v, o]
            trial = narrow(self.block, trials, self.best, self.rules)
            self.nodes += len(v)
            left[v[~trial.alive], o[~trial.alive]] = False
        return left

    def _take(self, plans: IntArray) -> FloatArray:
        """Judge plans and keep the best; return what every pair gets under them."""
        values = self.block.values(plans)
        scores = self.block.scale.scores(values)
        changes = self.block.changed(plans).sum(axis=1)
        order = self.block.scale.compare(scores, self.best.score)
        for i in np.flatnonzero(order >= 0):
            if self.rules.limit is not None and changes[i] > self.rules.limit:
                continue
            found = Best(plans[i].copy(), scores[i], int(changes[i]))
            if self._wanted(found):
                self.best, self.found = found, True
        return values

    def _wanted(self, found: Best) -> bool:
        order = int(self.block.scale.compare(found.score, self.best.score))
        if order or self.rules.ties == "none":
            return order > 0
        mine, other = (found.changes, *found.plan), (self.best.changes, *self.best.plan)
        return mine < other

    def _push(self, allowed: BoolArray, weight: FloatArray) -> None:
        """Keep the nodes that may hold something wanted, the most promising on top."""
        found = narrow(self.block, allowed, self.best, self.rules)
        self.nodes += len(weight)
        self.closed += float(weight[~found.alive].sum())
        left = [Node(found.allowed[i], found.bound[i], float(weight[i])) for i in np.flatnonzero(found.alive)]
        self._stack += sorted(left, key=lambda node: tuple(node.bound.tolist()))

    def _split(self, nodes: list[Node], level: int | None) -> None:
        """Judge a plan of each node and split those that it does not solve."""
        found = narrow(self.block, np.stack([n.allowed for n in nodes]), self.best, self.rules)
        plans = found.options
        if self.rules.limit is not None:
            plans = np.where(found.allowed[..., 0], 0, plans)
        alive = np.flatnonzero(found.alive)
        values = self._take(plans[alive]) if len(alive) else []
        self.closed += sum(nodes[i].weight for i in np.flatnonzero(~found.alive))
        children, weights = [], []
        for i, value in zip(alive, values, strict=True):
            allowed, weight = found.allowed[i], nodes[i].weight
            if level is not None and self._beyond(found.bound[i], level):
                self.aside.append(Node(allowed, found.bound[i], weight))
                continue
            variable = self._branch(allowed, plans[i], found.reach[i], value)
            if variable is None:
                self.closed += weight
                continue
            some = _children(allowed, variable)
            children.append(some)
            weights += [weight / len(some)] * len(some)
        if children:
            self._push(np.concatenate(children), np.array(weights))

    def _beyond(self, bound: FloatArray, level: int) -> bool:
        return bool((np.abs(bound - self.best.score)[: level + 1] <= self.block.scale.same).all())

    def _branch(self, node: BoolArray, plan: IntArray, reach: FloatArray, value: FloatArray) -> int | None:
        """Return the variable to split, None when the node is solved."""
        gap = reach - value
        down = gap > self.block.scale.same
        if self.block.as_yield:
            rows = np.argsort(-gap)[: int(down.sum())]
        else:
            rows = np.flatnonzero(down)[np.argsort(value[down])]
        for row in rows:
            variables = self.block.open_variables(node, plan, int(row))
            if len(variables):
                return int(variables[node[variables].sum(axis=1).argmin()])
        undecided = np.flatnonzero(node.sum(axis=1) > 1)
        if not len(undecided) or (self.rules.ties == "none" and not down.any()):
            return None
        return int(undecided[0])


def _children(node: BoolArray, variable: int) -> BoolArray:
    """Return a node once for each option that a variable has left."""
    options = np.flatnonzero(node[variable])
    children = np.repeat(node[None], len(options), axis=0)
    children[:, variable] = False
    children[np.arange(len(options)), variable, options] = True
    return children

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
#: Pairs that are looked at for the variable to split.
_ROWS = 6
#: Nodes split at once.
_SPLIT = 12

#: Asked between nodes whether to go on.
Watch = Callable[["Search"], bool]


@dataclass(frozen=True, slots=True)
class Node:
    """Plans that are still to be searched.

    Attributes
    ----------
    allowed : ndarray of bool, shape (n_variables, n_options)
        The options left.
    bound : ndarray, shape (n_figures,)
        A score that none of them exceeds.
    reach : ndarray, shape (n_rows,)
        What each pair reaches in it.
    options : ndarray of int, shape (n_variables,)
        The options taken for it.
    weight : float
        Share of the whole tree.
    """

    allowed: BoolArray
    bound: FloatArray
    reach: FloatArray
    options: IntArray
    weight: float


def nodes_of(found: Narrowed, weight: FloatArray) -> list[Node]:
    """Return what is alive after pruning as nodes."""
    return [
        Node(found.allowed[i], found.bound[i], found.reach[i], found.options[i], float(weight[i]))
        for i in np.flatnonzero(found.alive)
    ]


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
    failures : ndarray, shape (n_variables,)
        How often splitting each variable led nowhere; such variables are split first.
    aside : list of Node
        Nodes put aside by the last run.
    """

    block: Block
    best: Best
    rules: Rules
    watch: Watch
    failures: FloatArray
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
            width = 1 if first else _SPLIT
            top = self._stack[-width:]
            del self._stack[-width:]
            self._split(top, level)
        return True

    def left(self) -> list[Node]:
        """Return the nodes that are not settled."""
        return [*reversed(self._stack), *self.aside]

    def narrowed(self, allowed: BoolArray, weight: FloatArray) -> list[Node]:
        """Judge a plan of each node and return the nodes that are left, the most promising first.

        When it is time to stop, what was not looked at is left as one node.
        """
        nodes: list[Node] = []
        for i in range(0, len(allowed), _AT_ONCE):
            some, share = allowed[i : i + _AT_ONCE], weight[i : i + _AT_ONCE]
            stop = i > 0 and not self.watch(self)
            if stop:
                some, share = np.asarray(allowed[i:].any(axis=0))[None], weight[i:].sum(keepdims=True)
            found = narrow(self.block, some, self.best, self.rules)
            nodes += nodes_of(found, share)
            self.nodes += len(some)
            if found.alive.any():
                self._take(found.options[found.alive])
            if stop:
                break
        nodes = self._still_wanted(nodes) if nodes else []
        return sorted(nodes, key=lambda node: tuple(node.bound.tolist()), reverse=True)

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

    def _push(self, allowed: BoolArray, weight: FloatArray, split: IntArray) -> None:
        """Keep the nodes that may hold something wanted, the most promising on top."""
        found = narrow(self.block, allowed, self.best, self.rules)
        self.nodes += len(weight)
        self.closed += float(weight[~found.alive].sum())
        np.add.at(self.failures, split[~found.alive], 1.0)
        self._stack += sorted(nodes_of(found, weight), key=lambda node: tuple(node.bound.tolist()))

    def _split(self, nodes: list[Node], level: int | None) -> None:
        """Judge a plan of each node and split those that it does not solve."""
        nodes = self._still_wanted(nodes)
        if not nodes:
            return
        plans = np.stack([node.options for node in nodes])
        if self.rules.limit is not None:
            plans = np.where(np.stack([node.allowed for node in nodes])[..., 0], 0, plans)
        children, weights, split = [], [], []
        for node, plan, value in zip(nodes, plans, self._take(plans), strict=True):
            if level is not None and self._beyond(node.bound, level):
                self.aside.append(node)
                continue
            variable = self._branch(node.allowed, plan, node.reach, value)
            if variable is None:
                self.closed += node.weight
                continue
            some = _children(node.allowed, variable)
            children.append(some)
            weights += [node.weight / len(some)] * len(some)
            split += [variable] * len(some)
        if children:
            self._push(np.concatenate(children), np.array(weights), np.array(split))

    def _still_wanted(self, nodes: list[Node]) -> list[Node]:
        """Drop nodes that a better plan found meanwhile has settled."""
        order = self.block.scale.compare(np.stack([node.bound for node in nodes]), self.best.score)
        least = 1 if self.rules.ties == "none" else 0
        self.closed += sum(node.weight for node, o in zip(nodes, order, strict=True) if o < least)
        return [node for node, o in zip(nodes, order, strict=True) if o >= least]

    def _beyond(self, bound: FloatArray, level: int) -> bool:
        return not self.block.scale.apart(bound, self.best.score)[: level + 1].any()

    def _branch(self, node: BoolArray, plan: IntArray, reach: FloatArray, value: FloatArray) -> int | None:
        """Return the variable to split, None when the node is solved."""
        gap = reach - value
        down = self.block.scale.apart(reach, value) & (gap > 0)
        if self.block.as_yield:
            rows = np.argsort(-gap)[: int(down.sum())]
        else:
            rows = np.flatnonzero(down)[np.argsort(value[down])]
        variables: list[int] = []
        for k, row in enumerate(rows):
            if k >= _ROWS and variables:
                break
            variables += self.block.open_variables(node, plan, int(row)).tolist()
        if variables:
            found = np.array(variables)
            return int(found[(node[found].sum(axis=1) / (1 + self.failures[found])).argmin()])
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

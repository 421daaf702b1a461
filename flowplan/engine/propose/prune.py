"""Which options are left once something better than the best plan so far is wanted.

In a node every pair takes its best way through the options that are left, pairs of one group by one
option. No plan of the node does better. An option goes when its group with it, and every other group
at its best, would not be better than the best plan so far; what goes tightens the ways of other pairs,
so this is repeated until nothing goes. A plan that is as good as the best so far counts as better when
it changes fewer masks, or as many and stands earlier in the file.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.score import Groups, Scale
from flowplan.engine.sources import BoolArray, FloatArray, IntArray

#: Pairs' values held at once while options are tried.
_MOST_TRIED = 4_000_000


@dataclass(frozen=True, slots=True)
class Best:
    """A plan with what it gives.

    Attributes
    ----------
    plan : ndarray of int, shape (n_variables,)
        The option of each variable.
    score : ndarray, shape (n_figures,)
        Its score.
    changes : int
        How many masks it changes.
    """

    plan: IntArray
    score: FloatArray
    changes: int

    @classmethod
    def of(cls, block: Block, plan: IntArray) -> "Best":
        """Judge a plan."""
        score = block.scale.scores(block.values(plan[None]))[0]
        return cls(plan, score, int(block.changed(plan[None]).sum()))


@dataclass(frozen=True, slots=True)
class Rules:
    """What a plan must do to be wanted.

    Attributes
    ----------
    limit : int or None
        Most masks that may change.
    ties : {'none', 'break', 'keep'}
        What becomes of plans as good as the best so far: none is wanted, those that come before it by
        fewest changes and file order, or all of them.
    parts : tuple of (slice, ndarray)
        Pairs with the best score that they can reach, where that is known already: then no plan is
        better, and only plans that reach it in every part are as good.
    """

    limit: int | None
    ties: str
    parts: tuple[tuple[slice, FloatArray], ...] = ()

    def order(self, scale: Scale, rows: FloatArray, best: Best) -> IntArray:
        """Return 1, 0 or -1 where what pairs reach is better than, as good as or worse than the best."""
        if not self.parts:
            return scale.compare(scale.scores(rows), best.score)
        orders = [scale.compare(scale.scores(rows[:, part]), score) for part, score in self.parts]
        return np.asarray(np.minimum(0, np.min(orders, axis=0)))


@dataclass(frozen=True, slots=True)
class Narrowed:
    """Nodes after pruning.

    Attributes
    ----------
    alive : ndarray of bool, shape (n_nodes,)
        Whether a node can hold a wanted plan; the rest holds for these alone.
    allowed : ndarray of bool, shape (n_nodes, n_variables, n_options)
        The options left.
    bound : ndarray, shape (n_nodes, n_figures)
        Scores that no plan of the node exceeds.
    reach : ndarray, shape (n_nodes, n_rows)
        What each pair reaches in that bound.
    options : ndarray of int, shape (n_nodes, n_variables)
        The option that each group takes for it.
    """

    alive: BoolArray
    allowed: BoolArray
    bound: FloatArray
    reach: FloatArray
    options: IntArray


def narrow(block: Block, allowed: BoolArray, best: Best, rules: Rules) -> Narrowed:
    """Prune nodes until nothing more goes.

    Parameters
    ----------
    block : Block
        The variables.
    allowed : ndarray of bool, shape (n_nodes, n_variables, n_options)
        The options left.
    best : Best
        What is to be beaten.
    rules : Rules
        What is wanted.
    """
    allowed = allowed.copy()
    n_nodes = len(allowed)
    alive = np.ones(n_nodes, dtype=bool)
    bound = np.zeros((n_nodes, len(best.score)))
    reach = np.zeros((n_nodes, block.n_rows))
    options = np.zeros((n_nodes, len(block.choices)), dtype=np.int64)
    work = np.arange(n_nodes)
    while len(work):
        before = allowed[work]
        some = _within_limit(block, before.copy(), rules)
        ok = np.all(some.any(axis=2), axis=1)
        alive[work[~ok]] = False
        work, some, before = work[ok], some[ok], before[ok]
        if not len(work):
            break
        step = _Step(block, some, best, rules)
        allowed[work], bound[work], reach[work], options[work] = (
            step.left,
            step.bound,
            step.reach,
            step.options,
        )
        alive[work] = step.alive
        work = work[step.alive & (step.left != some).any(axis=(1, 2))]
    return Narrowed(alive, allowed, bound, reach, options)


def _within_limit(block: Block, allowed: BoolArray, rules: Rules) -> BoolArray:
    """Keep all other masks as they are once the limit is reached; leave nothing beyond it."""
    if rules.limit is None:
        return allowed
    forced = block.forced(allowed)
    used = forced.sum(axis=1)
    full = (used >= rules.limit)[:, None] & ~forced
    allowed[..., 1:] &= ~full[:, block.mask][..., None]
    allowed[used > rules.limit] = False
    return allowed


class _Step:
    """One round of pruning over nodes that all have options left."""

    def __init__(self, block: Block, allowed: BoolArray, best: Best, rules: Rules) -> None:
        self.block, self.best, self.rules = block, best, rules
        scale = block.scale
        self.values, self.pivots = block.reach(allowed)
        groups = Groups(self.values, self.pivots, allowed.shape[1], scale)
        self.grouped, self.equal = groups.values, groups.best(allowed)
        self.options = self.equal.argmax(axis=2)
        of_row = np.take_along_axis(self.options, self.pivots, axis=1)
        self.reach = np.take_along_axis(self.values, of_row[..., None], axis=2)[..., 0]
        order = rules.order(scale, self.reach, best)
        known = np.repeat(best.score[None], len(allowed), axis=0)
        self.bound = known if rules.parts else scale.scores(self.reach)
        self.alive = order > 0
        self.left = allowed.copy()
        if rules.ties != "none":
            self._ties(np.flatnonzero(order == 0))
        self._try_options(order)
        self.alive &= np.all(self.left.any(axis=2), axis=1)

    def _ties(self, nodes: IntArray) -> None:
        """Keep of nodes that can be as good as the best what comes before it in changes and order."""
        self.alive[nodes] = True
        if self.rules.ties == "keep":
            return
        forced = self.block.forced(self.left[nodes])
        for node, of_mask in zip(nodes, forced, strict=True):
            used = int(of_mask.sum())
            if used == self.best.changes:
                self.left[node, ~of_mask[self.block.mask], 1:] = False
                self.alive[node] = _earlier(self.left[node], self.best.plan)
            elif used > self.best.changes:
                self.alive[node] = False

    def _try_options(self, order: IntArray) -> None:
        """Take away the options with which a node would no longer be wanted."""
        tried = self._doubtful(order) & self.left & self.alive[:, None, None]
        sure = self._surely_worse(order) & tried
        self.left[sure] = False
        node, variable, option = np.nonzero(tried & ~sure)
        step = max(1, _MOST_TRIED // self.reach.shape[1])
        for i in range(0, len(node), step):
            some = slice(i, i + step)
            self._try(node[some], variable[some], option[some])

    def _surely_worse(self, order: IntArray) -> BoolArray:
        """Return options that need no trial, shape (n_nodes, n_variables, n_options).

        Of a node that is just as good as the best, each worse option of a group makes it worse. Another
        agrees with the best up to a figure; an option of which more pairs fall short of that figure than
        of the option taken brings the node below the best there.
        """
        scale, grouped = self.block.scale, self.grouped
        if scale.goal == "yield":
            return np.zeros(grouped.shape[:3], dtype=bool)
        tied = order == 0
        sure = np.zeros(grouped.shape[:3], dtype=bool)
        sure[tied] = ~self.equal[tied]
        if scale.goal == "worst" and not tied.all():
            first = scale.apart(self.bound, self.best.score).argmax(axis=1)
            least = self.best.score[first] - scale.same
            short = (grouped < least[:, None, None, None]).sum(axis=3)
            more = short > np.take_along_axis(short, self.options[..., None], axis=2)
            sure[~tied] = more[~tied]
        return sure

    def _try(self, node: IntArray, variable: IntArray, option: IntArray) -> None:
        scale = self.block.scale
        mine = self.pivots[node] == variable[:, None]
        rows = np.where(mine, self.values[node, :, option], self.reach[node])
        order = self.rules.order(scale, rows, self.best)
        gone = order < (1 if self.rules.ties == "none" else 0)
        self.left[node[gone], variable[gone], option[gone]] = False

    def _doubtful(self, order: IntArray) -> BoolArray:
        """Return which options may bring a node down, shape (n_nodes, n_variables, n_options)."""
        scale, score = self.block.scale, self.best.score
        taken = np.arange(self.grouped.shape[2]) == self.options[..., None]
        if scale.goal == "yield":
            return np.asarray(~taken)
        apart = scale.apart(self.bound, score)
        first = apart.argmax(axis=1)
        level = np.where(order == 0, np.inf, score[first] + scale.same)
        counted = first == 0 if scale.goal == "fails" else np.zeros(len(first), dtype=bool)
        level[counted & (order != 0)] = -np.inf
        found = self.grouped.min(axis=3) <= level[:, None, None]
        if scale.goal == "fails":
            failing = scale.fails(self.grouped)
            found |= failing > np.take_along_axis(failing, self.options[..., None], axis=2)
        return np.asarray(found & ~taken)


def _earlier(allowed: BoolArray, plan: IntArray) -> bool:
    """Keep what can stand before a plan in file order, in place; tell whether there is any."""
    for options, mine in zip(allowed, plan, strict=True):
        first = int(options.argmax())
        if first < mine:
            return True
        if first > mine:
            return False
        options[mine + 1 :] = False
    return False

"""A good plan to start from: change one mask at a time, for the pair that is worst off."""

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.prune import Best
from flowplan.engine.sources import BoolArray, IntArray


def climb(block: Block, best: Best, allowed: BoolArray, limit: int | None) -> Best:
    """Improve a plan until no change of one mask that a pair rests on makes it better.

    Parameters
    ----------
    block : Block
        The variables.
    best : Best
        Where to start.
    allowed : ndarray of bool, shape (n_variables, n_options)
        The options.
    limit : int or None
        Most masks that may change.

    Returns
    -------
    Best
        A plan that is no worse.
    """
    while True:
        found = _step(block, best, allowed, limit)
        if found is None:
            return best
        best = found


def _step(block: Block, best: Best, allowed: BoolArray, limit: int | None) -> Best | None:
    values = block.values(best.plan[None])[0]
    seen: set[int] = set()
    for row in np.argsort(values):
        variables = [v for v in block.open_variables(allowed, best.plan, int(row)) if int(v) not in seen]
        seen.update(int(v) for v in variables)
        plans = _neighbours(best.plan, variables, allowed)
        if limit is not None:
            plans = plans[block.changed(plans).sum(axis=1) <= limit]
        if not len(plans):
            continue
        scores = block.scale.scores(block.values(plans))
        top = max(range(len(plans)), key=lambda i: tuple(scores[i]))
        if block.scale.compare(scores[top], best.score) > 0:
            return Best.of(block, plans[top])
    return None


def _neighbours(plan: IntArray, variables: list[int], allowed: BoolArray) -> IntArray:
    """Return the plan with one of these variables changed, each to each of its other options."""
    moves = [(v, o) for v in variables for o in np.flatnonzero(allowed[v]) if o != plan[v]]
    plans = np.repeat(plan[None], len(moves), axis=0)
    for one, (variable, option) in zip(plans, moves, strict=True):
        one[variable] = option
    return plans

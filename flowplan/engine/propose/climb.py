"""Make a plan better by changing one or two masks on which a pair that is badly off rests."""

import numpy as np

from flowplan.engine.propose.block import Block
from flowplan.engine.propose.prune import Best, Rules
from flowplan.engine.sources import BoolArray, IntArray

#: Pairs that are looked at, from the worst.
_ROWS = 10
#: Plans with two changes tried at once.
_MOST = 1500


def climb(block: Block, best: Best, rules: Rules) -> Best:
    """Improve a plan until no change of one or two masks under its worst pairs makes it better.

    Parameters
    ----------
    block : Block
        The variables.
    best : Best
        Where to start.
    rules : Rules
        How many masks may change.

    Returns
    -------
    Best
        A plan that is no worse.
    """
    everything = block.everything
    while True:
        found = _step(block, best, everything, rules)
        if found is None:
            return best
        best = found


def _step(block: Block, best: Best, allowed: BoolArray, rules: Rules) -> Best | None:
    values = block.values(best.plan[None])[0]
    for row in np.argsort(values)[:_ROWS]:
        variables = block.open_variables(allowed, best.plan, int(row))
        if not len(variables):
            continue
        single = _changed(best.plan[None], variables, allowed)
        for plans in (single, _changed(single, variables, allowed)[:_MOST]):
            found = _best_of(block, plans, best, rules)
            if found is not None:
                return found
    return None


def _best_of(block: Block, plans: IntArray, best: Best, rules: Rules) -> Best | None:
    if rules.limit is not None:
        plans = plans[block.changed(plans).sum(axis=1) <= rules.limit]
    if not len(plans):
        return None
    scores = block.scale.scores(block.values(plans))
    top = max(range(len(plans)), key=lambda i: tuple(scores[i].tolist()))
    if block.scale.compare(scores[top], best.score) <= 0:
        return None
    return Best.of(block, plans[top])


def _changed(plans: IntArray, variables: IntArray, allowed: BoolArray) -> IntArray:
    """Return plans with one of these variables changed, each to each of its options."""
    moves = [(v, o) for v in variables for o in np.flatnonzero(allowed[v])]
    found = np.repeat(plans, len(moves), axis=0).reshape(len(plans), len(moves), -1)
    for k, (variable, option) in enumerate(moves):
        found[:, k, variable] = option
    return np.unique(found.reshape(-1, plans.shape[1]), axis=0)

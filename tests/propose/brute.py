"""The best plan by trying every one: slow, plain and independent of the search."""

from itertools import combinations, product

import numpy as np

from flowplan.engine.analysis import analyse


def judged(flow):
    """Return what each judged pair gets by the engine: margins and log(1 - fail probability)."""
    result = analyse(flow)
    entries = [e for e in result.entries if e.margin is not None]
    with np.errstate(divide="ignore"):
        chances = np.log1p(-np.array([e.fail_probability for e in entries]))
    return np.array([result.margin(e) for e in entries]), chances


def score(goal, values):
    """Return the score of values, as a list: the first figure that differs decides."""
    if goal == "yield":
        return [float(np.sum(values))]
    ordered = sorted(values)
    return ordered if goal == "worst" else [-sum(v < 0 for v in values), *ordered]


def compare(one, other, same):
    """Return 1, 0 or -1 as the first score is better, equal or worse."""
    for a, b in zip(one, other, strict=True):
        if abs(a - b) > same:
            return 1 if a > b else -1
    return 0


def best_of(scored, same):
    """Return all entries of (score, ...) that none is better than."""
    best = []
    for entry in scored:
        order = compare(entry[0], best[0][0], same) if best else 0
        if order > 0:
            best = [entry]
        elif order == 0:
            best.append(entry)
    return best


def brute_force(choices, goal, values_of, same, limit=None):
    """Return (score, plan) of the best plan.

    `values_of(axes, plans)` gives what the pairs on some axes get under many plans, each given by the
    options of the choices on these axes.
    """
    groups = sorted({c.axes for c in choices})
    tables = []
    for axes in groups:
        mine = [i for i, c in enumerate(choices) if c.axes == axes]
        table = []
        every = list(product(*(range(len(choices[i].options)) for i in mine)))
        for options, values in zip(every, values_of(axes, np.array(every)), strict=True):
            changed = frozenset(choices[i].mask for i, o in zip(mine, options, strict=True) if o)
            table.append((score(goal, values), values, changed, dict(zip(mine, options, strict=True))))
        tables.append(table)
    masks = list(dict.fromkeys(c.mask for c in choices if len(c.options) > 1))
    most = len(masks) if limit is None else min(limit, len(masks))
    found = []
    for allowed in map(frozenset, combinations(masks, most)):
        bests = [best_of([e for e in t if e[2] <= allowed], same) for t in tables]
        total = score(goal, np.concatenate([b[0][1] for b in bests]))
        for parts in product(*bests):
            changed = frozenset().union(*(p[2] for p in parts))
            merged = {i: o for p in parts for i, o in p[3].items()}
            plan = tuple(merged[i] for i in range(len(choices)))
            found.append((total, len(changed), plan))
    ties = best_of(found, same)
    _, _, plan = min(ties, key=lambda entry: entry[1:])
    return ties[0][0], plan

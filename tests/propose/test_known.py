"""Plans whose optimum is known without the search."""

import math

import numpy as np
import pytest
from scipy.optimize import linear_sum_assignment

from flowplan.engine.propose import GOALS, ladder, propose
from tests.propose.flows import sound


def chain(n, **top):
    """A chain of masks with equal independent hops; each may read any earlier mask, the last is judged."""
    masks = [{"id": "M0", "tool": "T", "aligns_to": "wafer"}]
    masks += [{"id": f"M{i}", "tool": "T", "aligns_to": f"M{i - 1}"} for i in range(1, n + 1)]
    pair = {"name": "last on first", "rule": "overlay", "between": ["M0", f"M{n}"], "limit": 100}
    tools = {"T": {"alignment": 10, "wafer_alignment": 1000}}
    return sound({"flow": "chain", "tools": tools, "masks": masks, "pairs": [pair]} | top)


def reads(flow, mask, axis):
    found = next(m for m in flow.masks if m.id == mask).aligns_to.on(axis)
    return [r.mask for r in found]


@pytest.mark.parametrize("hops", [2, 3, 5, 9])
def test_a_chain_of_equal_hops_is_best_aligned_directly_and_gains_the_root_of_the_hops(hops):
    """Common practice, no source: n equal independent hops add up to sqrt(n) times one."""
    found = propose(chain(hops), free_all=True)
    assert found.proved
    assert reads(found.flow, f"M{hops}", "x") == reads(found.flow, f"M{hops}", "y") == ["M0"]
    assert found.changed_masks == (f"M{hops}",)
    before, after = 100 - found.worst_before, 100 - found.worst_after
    assert before / after == pytest.approx(math.sqrt(hops), rel=1e-12)


def test_the_cheapest_way_wins_where_the_direct_reading_is_poor():
    """By hand: 3 and 4 nm by way of B make 5 nm; 6 nm directly. Along y the mark of B is spoilt."""
    spoilt = {"mask": "B", "alignment": {"random": {"x": 4, "y": 12}}}
    masks = [
        {"id": "A", "tool": "T", "aligns_to": "wafer"},
        {"id": "B", "tool": "T", "aligns_to": {"mask": "A", "alignment": 3}},
        {"id": "C", "tool": "T", "aligns_to": {"mask": "A", "alignment": 9}},
    ]
    masks[2]["may_align_to"] = [{"mask": "A", "alignment": 6}, spoilt]
    pair = {"name": "C on A", "rule": "overlay", "between": ["A", "C"], "limit": 20}
    data = {"flow": "ways", "tools": {"T": {"wafer_alignment": 99, "alignment": 9}}}
    found = propose(sound(data | {"masks": masks, "pairs": [pair]}))
    assert (reads(found.flow, "C", "x"), reads(found.flow, "C", "y")) == (["B"], ["A"])
    margins = {e.axis: found.after.margin(e) for e in found.after.entries}
    assert margins == pytest.approx({"x": 15.0, "y": 14.0}, rel=1e-12)
    together = propose(sound(data | {"masks": masks, "pairs": [pair]}), same_reference=True)
    assert reads(together.flow, "C", "x") == reads(together.flow, "C", "y") == ["A"]
    assert together.worst_after == pytest.approx(14.0, rel=1e-12)


@pytest.mark.parametrize("seed", range(8))
def test_the_yield_of_independent_masks_is_an_assignment(seed):
    """Outside check: scipy.optimize.linear_sum_assignment.

    Every mask reads one of four marks, each with a size of its own, so the losses of yield form a matrix
    of costs. Any number of masks may read one mark: with every mark repeated once a mask, the cheapest
    assignment of masks to marks is the best plan.
    """
    r = np.random.default_rng(seed)
    n, k = 6, 4
    spread = r.uniform(10, 20, (n, k))
    marks = [{"id": f"R{j}", "tool": "T", "aligns_to": {"mask": "R0", "alignment": 0.001}} for j in range(k)]
    marks[0]["aligns_to"] = "wafer"
    masks = []
    for i in range(n):
        ways = [{"mask": f"R{j}", "alignment": float(spread[i, j])} for j in range(k)]
        masks.append({"id": f"M{i}", "tool": "T", "aligns_to": ways[0], "may_align_to": ways[1:]})
    pairs = [
        {"name": f"p{i}", "rule": "overlay", "between": ["R0", f"M{i}"], "limit": 15, "axes": "x"}
        for i in range(n)
    ]
    tools = {"T": {"wafer_alignment": 99, "alignment": 9}}
    flow = sound({"flow": "assign", "tools": tools, "masks": [*marks, *masks], "pairs": pairs})
    found = propose(flow, goal="yield")
    hop = np.array([0.0] + [0.001] * (k - 1))
    sigma = np.hypot(spread, hop) / 3
    cost = -np.log1p(-np.vectorize(lambda s: math.erfc(15 / s / math.sqrt(2)))(sigma))
    rows, columns = linear_sum_assignment(np.repeat(cost, n, axis=1))
    assert found.proved
    assert -found.best == pytest.approx(np.repeat(cost, n, axis=1)[rows, columns].sum(), rel=1e-9)
    chosen = [int(reads(found.flow, f"M{i}", "x")[0][1:]) for i in range(n)]
    assert chosen == [int(c) // n for c in columns[np.argsort(rows)]]


def test_a_reading_that_serves_one_pair_is_not_bought_with_a_worse_one():
    """By hand: C on A has 10 to spare and C on B has 5; reading B costs A its room, so C reads A."""
    masks = [
        {"id": "A", "tool": "T", "aligns_to": "wafer"},
        {"id": "B", "tool": "T", "aligns_to": {"mask": "A", "alignment": 12}},
        {"id": "C", "tool": "T", "aligns_to": {"mask": "B", "alignment": 5}},
    ]
    masks[2]["may_align_to"] = [{"mask": "A", "alignment": 5}]
    pairs = [
        {"name": "C on A", "rule": "overlay", "between": ["A", "C"], "limit": 15},
        {"name": "C on B", "rule": "overlay", "between": ["B", "C"], "limit": 18},
    ]
    tools = {"T": {"wafer_alignment": 99, "alignment": 9}}
    flow = sound({"flow": "trade", "tools": tools, "masks": masks, "pairs": pairs})
    for goal in GOALS:
        assert reads(propose(flow, goal=goal).flow, "C", "x") == ["A"]
    # reads B: C on A needs 13 of 15, C on B 5 of 18; reads A: 5 of 15 and 13 of 18
    assert propose(flow).worst_after == pytest.approx(5.0, rel=1e-12)


def test_the_ladder_ends_with_the_unrestricted_best_and_names_the_fewest_changes():
    flow = chain(4, basis="mixed", pairs=[
        {"name": f"p{i}", "rule": "overlay", "between": ["M0", f"M{i}"], "limit": 12} for i in (2, 3, 4)
    ])  # fmt: skip
    found = ladder(flow, free_all=True)
    assert [len(step.changed_masks) for step in found.steps] == [0, 1, 2, 3]
    assert [step.counts_after["fail"] for step in found.steps] == [6, 4, 2, 0]
    assert (found.fewest, found.fewest_proved, found.proved) == (3, True, True)
    worst = [step.worst_after for step in found.steps]
    assert worst == sorted(worst)
    assert found.steps[-1].flow == propose(flow, free_all=True).flow

"""Few changes: exact however many candidates there are, and found soon."""

import random
import time

import pytest

from flowplan.engine.propose import GOALS, ladder, propose, solve
from flowplan.errors import UsageError
from tests.propose.flows import large_flow, small_flow, sound


@pytest.mark.parametrize("seed", range(1, 37, 2))
def test_one_tree_and_one_node_for_each_set_of_masks_give_the_same_plan(seed, monkeypatch):
    flow = small_flow(seed)
    asked = {"goal": GOALS[seed % 3], "changes": 1 + seed % 2, "same_reference": seed % 5 == 0}
    try:
        by_sets = propose(flow, **asked)
    except UsageError:
        pytest.skip("no mask of this random flow has a choice")
    monkeypatch.setattr(solve, "_MOST_SETS", 0)
    in_one = propose(flow, **asked)
    assert by_sets.proved
    assert in_one.proved
    assert by_sets.changes == in_one.changes


def crowd(n, seed=7):
    """Return a chain of many masks, each of which may read every earlier one, and a pair for each."""
    r = random.Random(seed)
    ids = [f"M{i:02d}" for i in range(n)]
    masks = [
        {"id": name, "tool": "T", "aligns_to": ids[i - 1] if i else "wafer", "mark_reading": r.randint(1, 5)}
        for i, name in enumerate(ids)
    ]
    pairs = [
        {"name": name, "rule": "overlay", "between": [ids[r.randrange(i)], name], "limit": r.randint(18, 30)}
        for i, name in enumerate(ids[1:], start=1)
    ]
    terms = {"stage": {"random": 3, "common": 0.6}, "drift": {"offset": 0.5, "random": 1, "common": 0.5}}
    tools = {"T": {"alignment": 5, "wafer_alignment": 99, "terms": terms}}
    return sound({"flow": "crowd", "tools": tools, "masks": masks, "pairs": pairs})


def test_two_changes_among_many_candidates_are_proved():
    """Among some 1e23 plans, and at least as good as each single change that the engine is shown."""
    flow = crowd(24)
    one, two = (propose(flow, free_all=True, changes=n, time_limit=60) for n in (1, 2))
    assert one.proved
    assert two.proved
    assert len(one.changed_masks) == 1
    assert two.worst_after >= one.worst_after > one.worst_before
    for mask in [m.id for m in flow.masks[2:]]:
        assert one.worst_after >= propose(flow, free=[mask]).worst_after


def test_a_ladder_that_runs_out_of_time_still_has_a_plan_on_every_step():
    began = time.monotonic()
    found = ladder(large_flow(1, n_masks=30, n_pairs=75), time_limit=1)
    assert time.monotonic() - began < 30  # a few looks for each of some 25 steps come on top
    assert not found.proved
    worst = [step.worst_after for step in found.steps]
    assert worst == sorted(worst)
    assert all(len(step.changed_masks) <= n for n, step in enumerate(found.steps[:-1]))
    assert worst[1] > worst[0]

"""What can be asked, what cannot, and what a search tells that is stopped early."""

import pytest

from flowplan.engine.propose import propose
from flowplan.errors import FlowError, UsageError
from flowplan.files.reader import parse
from tests.propose.brute import judged
from tests.propose.flows import large_flow, small_flow
from tests.propose.test_known import chain, reads


def codes(error):
    return [d.code for d in error.value.diagnostics]


def test_an_unknown_mask_is_named_with_the_nearest_one():
    with pytest.raises(UsageError) as error:
        propose(chain(3), free=["M7"], pin=["m2"])
    assert codes(error) == ["FP601", "FP601"]
    assert "M2" in error.value.diagnostics[1].hint


def test_a_mask_cannot_be_freed_and_pinned():
    with pytest.raises(UsageError) as error:
        propose(chain(3), free=["M2"], pin=["M2"])
    assert codes(error) == ["FP603"]


def test_without_a_candidate_there_is_nothing_to_choose():
    for asked in ({}, {"free_all": True, "pin": ["M1", "M2", "M3"]}):
        with pytest.raises(UsageError) as error:
            propose(chain(3), **asked)
        assert codes(error) == ["FP604"]


def test_without_a_judged_pair_no_plan_is_better():
    pair = {"name": "p", "rule": "overlay", "between": ["M0", "M3"]}
    with pytest.raises(UsageError) as error:
        propose(chain(3, pairs=[pair]), free_all=True)
    assert codes(error) == ["FP602"]


@pytest.mark.parametrize("asked", [{"goal": "wrost"}, {"changes": -1}, {"time_limit": 0}])
def test_numbers_and_words_that_make_no_sense_are_refused(asked):
    with pytest.raises(UsageError) as error:
        propose(chain(3), free_all=True, **asked)
    assert codes(error) == ["FP602"]


@pytest.mark.parametrize(("candidate", "code"), [("LATER", "FP303"), ("ERLY", "FP301")])
def test_a_candidate_that_cannot_be_read_is_shown_where_it_stands(candidate, code):
    text = f"""\
flow: bad candidate
tools: {{T: {{alignment: 10, wafer_alignment: 99}}}}
masks:
  - {{id: EARLY, tool: T, aligns_to: wafer}}
  - id: MID
    tool: T
    aligns_to: EARLY
    may_align_to:
      - {candidate}
  - {{id: LATER, tool: T, aligns_to: MID}}
pairs: [{{name: p, rule: overlay, between: [EARLY, MID], limit: 50}}]
"""
    with pytest.raises(FlowError) as error:
        parse(text, "bad.yaml")
    found = error.value.diagnostics[0]
    assert found.code == code
    assert found.span.line == 9
    assert "EARLY" in found.hint


def test_a_pinned_mask_keeps_the_plan_of_the_file():
    found = propose(chain(4), free_all=True, pin=["M4"])
    assert reads(found.flow, "M4", "x") == ["M3"]
    assert found.changed_masks == ("M3",)


def test_freeing_a_mask_leaves_the_others_alone():
    found = propose(chain(4), free=["M2"])
    assert found.changed_masks in ((), ("M2",))
    assert all(reads(found.flow, f"M{i}", "x") == [f"M{i - 1}"] for i in (1, 3, 4))


def test_no_change_allowed_gives_the_plan_of_the_file_back():
    flow = chain(4)
    found = propose(flow, free_all=True, changes=0)
    assert found.proved
    assert found.changes == ()
    assert found.flow == flow


@pytest.mark.parametrize("goal", ["worst", "fails", "yield"])
def test_a_search_that_is_stopped_says_what_no_plan_exceeds(goal):
    flow = large_flow(5, n_masks=14, n_candidates=4, n_pairs=30)
    best = propose(flow, goal=goal)
    assert best.proved
    assert best.bound == pytest.approx(best.best, rel=1e-9)
    sign = -1 if goal == "fails" else 1
    for patience in (0, 3, 12):
        asked = iter(range(10**9))
        stopped = propose(flow, goal=goal, stop=lambda asked=asked, most=patience: next(asked) >= most)
        assert sign * stopped.bound >= sign * best.best - 1e-9
        assert sign * stopped.best <= sign * best.best + 1e-9
        assert stopped.proved or stopped.closed < 1
    assert not propose(flow, goal=goal, stop=lambda: True).proved


def test_what_the_search_tells_on_the_way_holds():
    flow = large_flow(5, n_masks=20, n_pairs=50)
    told = []
    found = propose(flow, progress=told.append)
    assert found.proved
    assert told
    assert all(p.bound >= found.best - 1e-9 and p.best <= found.best + 1e-9 for p in told)
    assert all(0 <= p.closed <= 1 for p in told)


@pytest.mark.parametrize("seed", range(0, 40, 2))
def test_what_is_claimed_is_what_the_engine_says_of_the_new_flow(seed):
    flow = small_flow(seed)
    try:
        found = propose(flow)
    except UsageError:
        pytest.skip("no mask of this random flow has a choice")
    margins, _ = judged(found.flow)
    assert found.worst_after == min(margins)
    assert found.bound == pytest.approx(min(margins), rel=1e-9, abs=1e-7)

"""What helps a pair, on flows small enough to work out by hand."""

import math
from typing import Any

import pytest

from flowplan.engine.remedies import remedies
from flowplan.engine.remedies.changes import Redraw, Reread, Resize, SelfAlign, apply
from flowplan.engine.remedies.result import Case, Remedy
from flowplan.errors import UsageError
from flowplan.model.differences import readings_text
from flowplan.model.paths import quoted_sizes
from tests.support.flows import Data, bare_flow, flow_of, mask, overlay_pair

ROOT2, ROOT3 = math.sqrt(2), math.sqrt(3)


def chain_of_four(limit: float = 50, **more: Any) -> Data:
    """A <- B <- C <- D, each hop 30; D to A is 30 sqrt(3) = 52."""
    return bare_flow(
        [mask("A"), mask("B", "A"), mask("C", "B"), mask("D", "C")],
        [overlay_pair("A", "D", limit=limit, axes="x")],
        **{"tools": {"tool": {"alignment": 30}}} | more,
    )


def only_case(data: Data, **more: Any) -> Case:
    (case,) = remedies(flow_of(data), **more).cases
    return case


def rereads(case: Case, axes: str = "x") -> dict[tuple[str, str], Remedy]:
    """Changes of reading on just these axes by mask and what it reads then."""
    return {
        (r.change.mask, readings_text(r.change.after[0])): r
        for r in case.remedies
        if isinstance(r.change, Reread) and "".join(r.change.axes) == axes
    }


def of_kind(case: Case, kind: str) -> list[Remedy]:
    return [r for r in case.remedies if r.kind == kind]


def test_direct_alignment_saves_the_hops_between():
    # common practice, no source: one hop instead of three.
    found = rereads(only_case(chain_of_four()))["D", "A"]
    assert (found.kind, found.verdict) == ("direct", "pass")
    assert found.margin == pytest.approx(20)
    assert (found.effect.failing, found.effect.worse) == (0, 0)
    assert found.effect.worst == pytest.approx(20)


def test_any_mask_on_the_chain_may_be_aligned_anew():
    found = rereads(only_case(chain_of_four()))
    assert found["C", "A"].margin == pytest.approx(50 - 30 * ROOT2)
    assert found["D", "B"].margin == pytest.approx(50 - 30 * ROOT2)
    assert found["D", "B"].kind == "reference"
    assert ("B", "A") not in found  # it reads A as it is


def test_average_of_two_references():
    # half of A's reading and half of (B's reading with B on A): 30 sqrt(1/4 + 1/4 + 1/4)
    found = rereads(only_case(chain_of_four()))["D", "0.5 A + 0.5 B"]
    assert found.kind == "average"
    assert found.margin == pytest.approx(50 - 15 * ROOT3)


def test_reading_may_change_on_one_axis_or_on_both():
    case = only_case(chain_of_four())
    assert rereads(case, "xy")["D", "A"].margin == rereads(case, "x")["D", "A"].margin
    assert rereads(case, "y") == {}  # the pair is judged along x


def test_candidates_of_the_file_are_respected():
    data = chain_of_four()
    data["masks"][3]["may_align_to"] = ["B"]
    found = rereads(only_case(data))
    assert {mask_ for mask_, _ in found} == {"C", "D"}
    assert [reads for mask_, reads in found if mask_ == "D"] == ["B"]


def test_reading_of_which_nobody_says_how_well_it_goes_is_no_remedy():
    data = chain_of_four()
    data["tools"]["blind"] = {}
    data["masks"][3] |= {"tool": "blind", "aligns_to": {"mask": "C", "alignment": 30}}
    assert {mask_ for mask_, _ in rereads(only_case(data))} == {"C"}


def test_self_aligned_step_settles_the_pair():
    (found,) = of_kind(only_case(chain_of_four()), "self-align")
    assert found.change == SelfAlign("D", "A", "same")
    assert found.margin == 50


def test_earlier_layer_is_followed_and_edges_move_against_it_where_both_eat_room():
    data = chain_of_four()
    data["masks"][0]["cd"] = 20
    data["masks"][3]["cd"] = 10
    data["pairs"] = [{"name": "gap", "rule": "spacing", "between": ["D", "A"], "drawn": 50, "axes": "x"}]
    (found,) = of_kind(only_case(data), "self-align")
    assert found.change == SelfAlign("D", "A", "opposite")
    assert found.margin == pytest.approx(45)  # A's edges cancel, D keeps half of its CD


def test_self_aligned_feature_cannot_be_made_one():
    data = chain_of_four()
    data["self_aligned"] = [{"id": "S", "follows": "D"}]
    data["pairs"] = [overlay_pair("A", "S", limit=50, axes="x")]
    case = only_case(data)
    assert of_kind(case, "self-align") == []
    assert rereads(case)["D", "A"].kind == "reference"  # S follows D, so aligning D helps S


def test_drawn_rule_is_widened_by_what_is_missing():
    (found,) = of_kind(only_case(chain_of_four()), "rule")
    assert isinstance(found.change, Redraw)
    assert found.change.after == pytest.approx(30 * ROOT3)
    assert (found.margin, found.verdict) == (pytest.approx(0, abs=1e-9), "pass")


def test_reserve_is_a_share_of_the_new_dimension():
    (found,) = of_kind(only_case(chain_of_four(reserve=0.1)), "rule")
    assert found.for_zero == pytest.approx(30 * ROOT3)
    assert found.for_reserve == pytest.approx(30 * ROOT3 / 0.9)
    assert found.verdict == "pass"


def test_source_shrinks_until_the_margin_is_there():
    (found,) = of_kind(only_case(chain_of_four(reserve=0.1)), "size")
    assert isinstance(found.change, Resize)
    assert found.change.quoted.path == "tools.tool.alignment"
    assert found.for_zero == pytest.approx(50 / ROOT3)
    assert found.for_reserve == pytest.approx(45 / ROOT3)
    assert found.margin == pytest.approx(5)


def test_source_that_is_not_enough_alone_says_so():
    data = chain_of_four(45)
    data["masks"][1]["mark_reading"] = 10
    found = {r.change.quoted.path: r for r in of_kind(only_case(data), "size")}
    weak = found["masks.B.mark_reading"]
    assert (weak.for_zero, weak.for_reserve, weak.is_enough) == (None, None, False)
    assert weak.change.after == 0
    assert weak.margin == pytest.approx(45 - 30 * ROOT3)
    assert found["tools.tool.alignment"].is_enough


def test_others_that_get_worse_and_that_break_are_counted():
    data = chain_of_four()
    data["pairs"] += [overlay_pair("C", "D", limit=40, axes="x"), overlay_pair("B", "D", limit=90, axes="x")]
    found = rereads(only_case(data))["D", "A"].effect
    # D to C becomes 52 of 40; D to B stays at two hops.
    assert (found.failing, found.worse, found.breaks) == (1, 1, 1)
    assert found.worst == pytest.approx(40 - 30 * ROOT3)


def test_what_failed_before_gets_worse_but_is_not_broken():
    data = chain_of_four()
    data["pairs"] += [overlay_pair("C", "D", limit=29, axes="x")]
    case = next(c for c in remedies(flow_of(data)).cases if c.entry.pair.name == "A-D")
    (step,) = of_kind(case, "self-align")
    for remedy in (rereads(case)["D", "A"], step):
        assert (remedy.effect.worse, remedy.effect.breaks) == (1, 0)


def test_small_gain_is_a_gain():
    data = chain_of_four()
    data["masks"][1]["mark_reading"] = 1  # of 52 it takes a hundredth
    found = {r.change.quoted.path: r for r in of_kind(only_case(data), "size")}
    gain = found["masks.B.mark_reading"].margin - only_case(data).margin
    assert gain == pytest.approx(math.sqrt(3 * 30**2 + 1) - math.sqrt(3 * 30**2))


def test_best_comes_first():
    data = chain_of_four()
    data["pairs"] += [overlay_pair("C", "D", limit=40, axes="x")]
    ranked = only_case(data).remedies
    keys = [(r.effect.failing, r.verdict != "pass") for r in ranked]
    assert keys == sorted(keys)
    # Aligning D to A breaks the pair of C and D, so aligning C to A is better though it gives less.
    order = list(rereads(only_case(data)))
    assert order.index(("C", "A")) < order.index(("D", "A"))
    found = rereads(only_case(data))
    assert found["C", "A"].margin < found["D", "A"].margin


def test_pairs_that_pass_are_left_alone_unless_asked_for():
    assert remedies(flow_of(chain_of_four(60))).cases == ()
    case = only_case(chain_of_four(60), every=True)
    assert rereads(case)["D", "A"].margin == pytest.approx(30)


def test_named_pairs_alone_are_looked_at():
    data = chain_of_four()
    data["pairs"] += [overlay_pair("B", "D", limit=40, axes="x")]
    assert only_case(data, pairs=["B-D"]).entry.pair.name == "B-D"


def test_unknown_pair_is_refused_with_the_nearest():
    with pytest.raises(UsageError) as caught:
        remedies(flow_of(chain_of_four()), ["A_D"])
    (problem,) = caught.value.diagnostics
    assert (problem.code, problem.message) == ("FP602", "unknown pair 'A_D'")
    assert problem.hint == "did you mean 'A-D'?"


def test_progress_reaches_its_end():
    steps: list[tuple[int, int]] = []
    remedies(flow_of(chain_of_four()), progress=lambda done, total: steps.append((done, total)))
    assert steps[-1][0] == steps[-1][1]
    assert [done for done, _ in steps] == list(range(1, len(steps) + 1))


def test_making_a_step_self_aligned_keeps_half_the_cd_on_each_edge():
    data = chain_of_four()
    data["masks"][3]["cd"] = {"random": {"x": 12, "y": 16}, "offset": -4}
    edited = apply(flow_of(data), SelfAlign("D", "A", "same"))
    sizes = {(q.path, q.axis): q.size.value for q in quoted_sizes(edited)}
    assert sizes["self_aligned.D.edge", "x"] == 6
    assert sizes["self_aligned.D.edge", "y"] == 8
    assert edited.self_aligned[0].edge.offset.x.value == -2

"""Plans side by side: what changed in the flow, and what it did to each pair."""

import pytest

from flowplan.engine.analysis import analyse
from flowplan.engine.compare import Comparison, Row, compare
from flowplan.model.differences import Difference, differences, readings_text, size_text
from flowplan.model.edits import self_aligned, with_drawn, with_references
from flowplan.model.masks import Reading
from flowplan.model.terms import Size
from tests.support.flows import Data, bare_flow, flow_of, mask, overlay_pair


def chain_of_three(**more: object) -> Data:
    """A <- B <- C, each hop 30; C to A is 30 sqrt(2)."""
    return bare_flow(
        [mask("A"), mask("B", "A"), mask("C", "B")],
        [overlay_pair("A", "C", limit=45), overlay_pair("B", "C", limit=45)],
        tools={"tool": {"alignment": 30}},
        **more,
    )


def row(comparison: Comparison, pair: str) -> Row:
    return next(r for r in comparison.rows if r.pair == pair and r.axis == "x")


def two(base: Data, other: Data) -> Comparison:
    return compare([("base", analyse(flow_of(base))), ("other", analyse(flow_of(other)))])


def test_direct_alignment_gains_the_root_of_the_number_of_hops():
    # common practice, no source: n equal independent hops add to sqrt(n) of one.
    flow = flow_of(chain_of_three())
    direct = with_references(flow, {("C", axis): (Reading(mask="A"),) for axis in ("x", "y")})
    comparison = compare([("as is", analyse(flow)), ("direct", analyse(direct))])
    pair = row(comparison, "A-C")
    assert pair.margins == pytest.approx((45 - 30 * 2**0.5, 15))
    assert pair.change(1) == pytest.approx(30 * 2**0.5 - 30)
    assert (pair.status(1), row(comparison, "B-C").status(1)) == ("better", "worse")
    assert comparison.plans[1].changes == (
        Difference("masks", "C", "aligns_to.x", "B", "A"),
        Difference("masks", "C", "aligns_to.y", "B", "A"),
    )


def test_verdict_change_is_seen():
    comparison = two(chain_of_three(), chain_of_three() | {"confidence": 2})
    assert row(comparison, "A-C").verdicts() == ("pass", "fail")
    assert comparison.plans[1].changes == (Difference("flow", "", "confidence", "1", "2"),)


def test_pairs_appear_and_disappear():
    more = chain_of_three()
    more["pairs"] = [*more["pairs"][:1], overlay_pair("A", "B", limit=50)]
    comparison = two(chain_of_three(), more)
    assert row(comparison, "B-C").status(1) == "disappears"
    assert row(comparison, "A-B").status(1) == "appears"
    assert row(comparison, "A-B").change(1) is None
    gone, new = comparison.plans[1].changes
    assert (gone.of, gone.before, gone.after) == ("B-C", "present", "")
    assert (new.of, new.before, new.after) == ("A-B", "", "present")


def test_self_aligned_step_settles_its_pair():
    flow = flow_of(chain_of_three())
    comparison = compare([("mask", analyse(flow)), ("step", analyse(self_aligned(flow, "C", "B")))])
    assert row(comparison, "B-C").settled == (False, True)
    assert row(comparison, "B-C").status(1) == "settled"
    assert row(comparison, "A-C").status(1) == "better"


def test_units_of_the_files_may_differ():
    micrometres = chain_of_three(unit="um")
    micrometres["tools"] = {"tool": {"alignment": 0.03}}
    micrometres["pairs"] = [overlay_pair("A", "C", limit=0.045), overlay_pair("B", "C", limit=0.045)]
    comparison = two(chain_of_three(), micrometres)
    assert {r.status(1) for r in comparison.rows} == {"same"}


def test_one_plan_is_not_a_comparison():
    with pytest.raises(ValueError, match="two plans"):
        compare([("alone", analyse(flow_of(chain_of_three())))])


def test_equal_flows_do_not_differ():
    assert differences(flow_of(chain_of_three()), flow_of(chain_of_three())) == ()


def test_changed_sizes_are_told_by_their_place():
    other = chain_of_three()
    other["tools"] = {"tool": {"alignment": {"x": 30, "y": 20}, "terms": {"lens": {"bound": 5}}}}
    found = {(d.what, d.before, d.after) for d in differences(flow_of(chain_of_three()), flow_of(other))}
    assert ("alignment.random", "30", "x 30, y 20") in found
    assert ("terms.lens.bound", "", "5") in found


def test_widened_rule_is_a_changed_pair():
    flow = flow_of(chain_of_three())
    wider = with_drawn(flow, "A-C", "y", 60.0)
    assert differences(flow, wider) == (Difference("pairs", "A-C", "limit", "45", "x 45, y 60 nm"),)
    margins = {(e.pair.name, e.axis): e.margin.mixed for e in analyse(wider).entries if e.margin}
    assert margins["A-C", "y"] == pytest.approx(60 - 30 * 2**0.5)
    assert margins["A-C", "x"] == pytest.approx(45 - 30 * 2**0.5)


def test_references_read_as_one_would_say_them():
    half = (Reading(mask="A"), Reading(mask="B", alignment=Size(random=7)))
    assert readings_text(half) == "0.5 A + 0.5 B (alignment 7)"
    assert readings_text(half[:1]) == "A"
    assert size_text(Size(random=30, bound=5)) == "random 30, bound 5"

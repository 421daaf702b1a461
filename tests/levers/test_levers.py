"""What quoted sizes are worth, on flows small enough to work out by hand."""

import math
from typing import Any

import pytest

from flowplan.engine.levers import Lever, levers
from flowplan.errors import UsageError
from tests.support.flows import Data, bare_flow, flow_of, mask, overlay_pair


def chain(limits: tuple[float, float] = (45, 45), **more: Any) -> Data:
    """A <- B <- C, each hop 30; C to A is 30 sqrt(2)."""
    return bare_flow(
        [mask("A"), mask("B", "A"), mask("C", "B")],
        [overlay_pair("A", "C", limit=limits[0]), overlay_pair("B", "C", limit=limits[1])],
        **{"tools": {"tool": {"alignment": 30}}} | more,
    )


def lever(data: Data, path: str, axis: str | None = None) -> Lever:
    (found,) = [x for x in levers(flow_of(data)).levers if (x.quoted.path, x.quoted.axis) == (path, axis)]
    return found


def test_two_equal_hops_share_the_limit():
    # common practice, no source: 45 = a sqrt(2).
    found = lever(chain(), "tools.tool.alignment")
    assert found.value == 30
    assert found.largest == pytest.approx(45 / math.sqrt(2), rel=1e-12)
    assert found.derivative == pytest.approx(-math.sqrt(2), rel=1e-12)
    assert found.halved.worst == pytest.approx(15 * math.sqrt(2), rel=1e-12)
    assert found.removed.worst == pytest.approx(30 * math.sqrt(2), rel=1e-12)
    assert found.dominates == 4  # two pairs on two axes


def test_failing_margins_that_a_smaller_size_mends_are_counted():
    found = levers(flow_of(chain((40, 45))))
    assert (found.failing, found.worst) == (2, pytest.approx(40 - 30 * math.sqrt(2)))
    assert (found.levers[0].halved.failing, found.levers[0].removed.failing) == (2, 2)
    assert found.levers[0].largest == pytest.approx(40 / math.sqrt(2), rel=1e-12)


def test_no_value_helps_a_pair_that_the_size_has_no_part_in():
    more = chain((40, 45))
    more["masks"][1]["mark_reading"] = 5
    more["masks"].append(mask("D", "B"))
    more["pairs"].append(overlay_pair("C", "D", limit=80))
    found = lever(more, "masks.B.mark_reading")
    assert (found.largest, found.is_unlimited) == (None, False)


def test_size_that_no_judged_pair_depends_on_may_be_anything():
    data = chain(tools={"tool": {"alignment": 30, "wafer_alignment": 900}})
    found = lever(data, "tools.tool.wafer_alignment")
    assert found.is_unlimited
    assert (found.removed.worst, found.derivative, found.dominates) == (0, 0, 0)


def test_it_may_not_be_anything_while_another_pair_fails():
    data = chain((40, 45), tools={"tool": {"alignment": 30, "wafer_alignment": 900}})
    found = lever(data, "tools.tool.wafer_alignment")
    assert (found.largest, found.is_unlimited) == (None, False)


def test_numbers_of_one_axis_are_levers_of_their_own():
    data = chain(tools={"tool": {"alignment": {"x": 30, "y": 20}}})
    x, y = (lever(data, "tools.tool.alignment", axis) for axis in ("x", "y"))
    assert (x.value, y.value) == (30, 20)
    assert (x.derivative, y.derivative) == (pytest.approx(-math.sqrt(2)), 0)
    assert y.largest == pytest.approx(45 / math.sqrt(2), rel=1e-12)


def test_size_of_zero_can_only_grow():
    data = chain()
    data["masks"][1]["mark_reading"] = 0
    found = lever(data, "masks.B.mark_reading")
    assert (found.value, found.halved.worst, found.removed.worst) == (0, 0, 0)
    # 45^2 = 2 30^2 + m^2; a random error that starts at 0 among others costs nothing at first.
    assert found.largest == pytest.approx(math.sqrt(45**2 - 2 * 30**2), rel=1e-9)
    assert found.derivative == 0


def test_bound_of_zero_costs_its_full_length_from_the_start():
    data = chain()
    data["masks"][2]["terms"] = {"tilt": {"bound": 0, "enters": "pattern"}}
    found = lever(data, "masks.C.terms.tilt.bound")
    assert found.derivative == -1
    assert found.largest == pytest.approx(45 - 30 * math.sqrt(2), rel=1e-12)


def test_error_shared_with_another_mask_may_be_better_larger():
    """A and B meet one stress of 10 and 16: B on A sees 6, and nothing once B's is 10."""
    stress = {"source": "stress", "enters": "pattern"}
    data = bare_flow(
        [
            mask("A", terms={"s": {"bound": 10} | stress}),
            mask("B", "A", terms={"s": {"bound": 16} | stress}),
        ],
        [overlay_pair("A", "B", limit=5)],
    )
    found = lever(data, "masks.B.terms.s.bound")
    assert found.largest == pytest.approx(15, rel=1e-12)
    assert found.removed.worst == pytest.approx(-4)
    assert found.halved.worst == pytest.approx(4)
    assert lever(data, "masks.A.terms.s.bound").largest == pytest.approx(21, rel=1e-12)


def test_slope_at_a_tie_is_the_one_towards_smaller_sizes():
    """At 30 both pairs have 10 left; below, the pair of one hop is the worse, and its slope is -1."""
    found = lever(chain((30 * math.sqrt(2) + 10, 40)), "tools.tool.alignment")
    assert found.derivative == pytest.approx(-1)


def test_slope_of_a_size_of_zero_is_the_one_towards_larger_sizes():
    data = chain((40, 40), tools={"tool": {"alignment": 0}})
    assert lever(data, "tools.tool.alignment").derivative == pytest.approx(-math.sqrt(2))


def test_angle_keeps_its_unit_and_the_worst_corner_counts():
    # at the corner of a 20 mm field 0.5 urad is 5 nm along each axis
    data = bare_flow(
        [mask("A"), mask("B", "A", terms={"turn": {"bound": "0.5 urad", "shape": "rotation"}})],
        [overlay_pair("A", "B", limit=8)],
        field={"x": "20 mm", "y": "20 mm"},
    )
    found = lever(data, "masks.B.terms.turn.bound")
    assert found.value == 0.5
    assert found.largest == pytest.approx(0.8, rel=1e-12)
    assert found.derivative == pytest.approx(-10)


def test_own_alignment_of_a_reading_is_a_lever():
    data = chain()
    data["masks"][2]["aligns_to"] = {"mask": "B", "alignment": 10}
    found = lever(data, "masks.C.aligns_to.B.alignment")
    assert found.largest == pytest.approx(math.sqrt(45**2 - 30**2), rel=1e-12)


def test_one_margin_has_one_leader_and_the_first_on_a_tie():
    data = chain()
    data["tools"]["tool"] = {"alignment": 30, "terms": {"stage": {"random": 30}}}
    count = {x.quoted.path: x.dominates for x in levers(flow_of(data)).levers}
    assert count == {"tools.tool.alignment": 4, "tools.tool.terms.stage.random": 0}


def test_most_worthwhile_comes_first():
    data = chain()
    data["tools"]["tool"] = {"alignment": 20, "terms": {"stage": {"random": 22}}}
    assert [x.quoted.path for x in levers(flow_of(data)).levers] == [
        "tools.tool.terms.stage.random", "tools.tool.alignment",
    ]  # fmt: skip


def test_flow_that_judges_nothing_has_levers_without_worth():
    data = chain()
    data["pairs"] = [overlay_pair("A", "C")]
    found = levers(flow_of(data))
    assert (found.worst, found.failing) == (None, 0)
    assert found.levers[0].is_unlimited
    assert found.levers[0].removed.worst == 0


def test_path_may_name_everything_under_it():
    data = chain(tools={"tool": {"alignment": 30, "terms": {"stage": 5, "lens": {"bound": 3}}}})
    found = levers(flow_of(data), ["tools.tool.terms"])
    assert {x.quoted.path for x in found.levers} == {
        "tools.tool.terms.stage.random", "tools.tool.terms.lens.bound",
    }  # fmt: skip


def test_unknown_path_is_refused_with_the_nearest():
    with pytest.raises(UsageError) as caught:
        levers(flow_of(chain()), ["tools.tool.alinment"])
    (problem,) = caught.value.diagnostics
    assert (problem.code, problem.hint) == ("FP602", "did you mean 'tools.tool.alignment'?")

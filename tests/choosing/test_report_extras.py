"""What a report says about choosing, in flows of any size."""

from flowplan.engine.analysis import analyse
from flowplan.report import choosing
from flowplan.report.choosing import report_extras
from flowplan.report.page import render_report
from tests.support.flows import bare_flow, flow_of, mask, overlay_pair

FLOW = flow_of(
    bare_flow(
        [mask("A"), mask("B", "A"), mask("C", "B")],
        [overlay_pair("A", "C", limit=40), overlay_pair("B", "C", limit=45)],
        tools={"tool": {"alignment": 30}},
    )
)


def test_remedies_stand_in_the_order_of_need():
    found = report_extras(analyse(FLOW), {}).remedies
    assert [case.title.split(":")[0] for case in found.cases] == ["A-C along x", "A-C along y"]
    assert (found.left_out, found.cases[0].rows[0][2]) == (0, "pass")


def test_a_flow_without_variants_or_other_references_has_no_such_sections():
    extras = report_extras(analyse(FLOW), {})
    assert (extras.comparison, extras.ladder) == (None, None)


def test_what_a_large_flow_leaves_to_the_command_is_said(monkeypatch):
    monkeypatch.setattr(choosing, "_MOST_ENTRIES", 3)
    result = analyse(FLOW)
    extras = report_extras(result, {})
    assert (extras.remedies.cases, extras.remedies.left_out) == ((), 2)
    assert "2 checks fail or are tight. In a flow of this size" in render_report(result, extras=extras)


def test_only_the_neediest_are_listed_and_the_rest_counted(monkeypatch):
    monkeypatch.setattr(choosing, "_MOST_CASES", 1)
    result = analyse(FLOW)
    extras = report_extras(result, {})
    assert (len(extras.remedies.cases), extras.remedies.left_out) == (1, 1)
    assert "takes the other 1 as well" in render_report(result, extras=extras)


def test_nothing_to_mend():
    fine = FLOW.model_copy(update={"confidence": 0.5})
    assert "there is nothing to mend" in render_report(analyse(fine), extras=report_extras(analyse(fine), {}))

"""The library's front door: load, analyse, look."""

import json

import pytest

import flowplan
from flowplan.api import Analysis
from flowplan.files.resources import resource_folder
from tests.support.flows import bare_flow, flow_of, mask, overlay_pair


@pytest.fixture
def analysis() -> Analysis:
    masks = [mask("A"), mask("B", "A", terms={"t": {"random": 3, "offset": 1}})]
    pairs = [overlay_pair("A", "B", limit=5, axes="x"), overlay_pair("B", "A", axes="y")]
    return flowplan.analyse(flow_of(bare_flow(masks, pairs, unit="um", flow="Estuary <test>")))


def test_an_example_from_file_to_verdicts():
    result = flowplan.analyse(flowplan.load(resource_folder("flows") / "cmos.yaml"))
    assert sum(result.counts.values()) == len(result.entries) > 20
    assert result.worst is min((e for e in result.entries if e.margin), key=lambda e: e.margin.mixed)


def test_entries_are_in_nm_and_records_in_the_file_s_unit(analysis):
    assert analysis.entries[0].overlay.random == pytest.approx(3000)
    record = analysis.to_records()[0]
    assert (record["drawn"], record["random"], record["margin"]["mixed"]) == (5, 3, 1)


def test_the_document_is_what_the_margins_command_prints(analysis):
    document = analysis.to_document()
    assert document["margins"] == analysis.to_records()
    assert document["counts"] == {"pass": 1, "tight": 0, "fail": 0, "unjudged": 1}
    assert json.loads(json.dumps(document, allow_nan=False)) == document


def test_the_report_and_the_notebook_summary_escape_the_flow_s_name(analysis):
    for html in (analysis.to_html(), analysis._repr_html_()):
        assert "Estuary &lt;test&gt;" in html
        assert "<test>" not in html


def test_flow_and_worst_come_from_the_result(analysis):
    assert analysis.flow is analysis.result.flow
    assert analysis.worst is analysis.entries[0]

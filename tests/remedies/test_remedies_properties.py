"""What holds of the remedies of every flow."""

import pytest
from hypothesis import given, settings

from flowplan.engine.analysis import analyse
from flowplan.engine.remedies import remedies
from flowplan.engine.remedies.changes import apply
from flowplan.engine.remedies.work import worth
from flowplan.report.records_remedies import remedies_document
from flowplan.report.remedytext import best_of_each
from tests.support.flows import flow_of
from tests.support.random_flows import flows


def margins_of(flow):
    """Margin of every judged entry, and the length that rounding is measured against."""
    result = analyse(flow)
    entries = [e for e in result.entries if e.margin is not None]
    margins = {(e.pair.name, *e.layers, e.axis): result.margin(e) for e in entries}
    return margins, max((e.drawn + abs(e.keep) + e.need.linear for e in entries), default=0.0)


@settings(max_examples=25)
@given(data=flows())
def test_each_change_made_in_the_flow_does_what_its_remedy_says(data):
    flow = flow_of(data)
    found = remedies(flow)
    assert len(remedies_document(found)["cases"]) == len(found.cases)
    for case in found.cases[:3]:
        key = (case.entry.pair.name, *case.entry.layers, case.entry.axis)
        assert list(case.remedies) == sorted(case.remedies, key=worth)
        for remedy in best_of_each(case.remedies, 1):
            after, scale = margins_of(apply(flow, remedy.change))
            close = 1e-7 * scale + 1e-9
            assert remedy.margin == pytest.approx(after[key], abs=close)
            assert remedy.effect.worst == pytest.approx(min(after.values()), abs=close)
            assert remedy.margin > case.margin

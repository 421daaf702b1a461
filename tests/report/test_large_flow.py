"""The report of a flow far larger than most: 200 masks, 2,000 pairs, every shape on a 300 mm wafer."""

import pytest

from flowplan.report.page import render_report
from tests.support.flows import margins_of
from tests.support.generated import generated_flow


@pytest.mark.slow
def test_report_of_200_masks_and_2000_pairs_stays_below_ten_megabytes() -> None:
    """Slow because the flow is large: it takes several seconds to analyse and draw."""
    result = margins_of(generated_flow(200, 2000))
    assert (len(result.flow.masks), len(result.flow.pairs)) == (200, 2000)
    assert result.engine.sites.n_points >= 500
    text = render_report(result)
    assert text.count("<details id=p") == 2000
    assert len(text.encode()) < 10_000_000

"""Reports for the tests: one example flow after the other, and a hostile flow."""

import pytest

from flowplan.report.page import render_report
from tests.support.examples import EXAMPLES
from tests.support.flows import margins_of
from tests.support.hostile import hostile_flow
from tests.support.page import Element, parse_page


@pytest.fixture(params=EXAMPLES)
def name(request: pytest.FixtureRequest) -> str:
    """Name each example flow in turn."""
    return str(request.param)


@pytest.fixture(scope="session")
def hostile_text() -> str:
    """Render the report of the hostile flow."""
    return render_report(margins_of(hostile_flow()))


@pytest.fixture(scope="session")
def hostile_page(hostile_text: str) -> Element:
    """Read the report of the hostile flow back."""
    return parse_page(hostile_text)

"""The example flows, analysed, rendered and read back once for each test process."""

from functools import cache
from pathlib import Path

import flowplan
from flowplan.engine.analysis import Result
from flowplan.report.page import render_report
from tests.support.page import Element, parse_page

FLOWS = Path(__file__).parents[2] / "flows"
EXAMPLES = sorted(path.stem for path in FLOWS.glob("*.yaml"))


@cache
def example(name: str) -> Result:
    """Analyse an example flow."""
    return flowplan.analyse(flowplan.load(FLOWS / f"{name}.yaml")).result


@cache
def example_text(name: str) -> str:
    """Render the report of an example flow."""
    return render_report(example(name))


@cache
def example_page(name: str) -> Element:
    """Read the report of an example flow back."""
    return parse_page(example_text(name))

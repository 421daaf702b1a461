"""Whole processes and the report, as ratios against work of the same kind taken in turns."""

import subprocess
import sys

import pytest

from flowplan.api import Analysis
from flowplan.engine.analysis import analyse
from flowplan.files.resources import resource_folder
from tests.support.flows import flow_of
from tests.support.generated import generated_flow
from tests.support.timing import quickest_in_turns

MARGINS = [sys.executable, "-m", "flowplan", "margins", str(resource_folder("flows") / "cmos.yaml")]
IMPORTS = [sys.executable, "-c", "import pydantic, numpy, networkx"]


def run(command):
    subprocess.run(command, check=True, capture_output=True)


def test_margins_of_an_example_cost_at_most_three_times_the_imports(benchmark):
    """The whole process, start of the interpreter included, against one that only imports."""
    run(MARGINS)  # so that byte code and file caches are warm on either side
    margins, imports = benchmark.pedantic(
        quickest_in_turns, args=(5, lambda: run(MARGINS), lambda: run(IMPORTS))
    )
    benchmark.extra_info["times the imports"] = round(margins / imports, 2)
    assert margins / imports <= 3


@pytest.mark.slow
def test_report_of_200_masks_and_2000_pairs(benchmark):
    """Under 10 MB, and at most twelve times what the engine takes for the same flow.

    Aimed at are 15 s; the engine takes a good second on an ordinary machine.
    """
    result = analyse(flow_of(generated_flow()))
    page = []
    report, engine = benchmark.pedantic(
        quickest_in_turns,
        args=(1, lambda: page.append(Analysis(result).to_html()), lambda: analyse(result.flow)),
    )
    benchmark.extra_info |= {
        "MB": round(len(page[0].encode()) / 1e6, 2),
        "times the engine": round(report / engine, 1),
    }
    assert len(page[0].encode()) < 10e6
    assert report / engine < 12

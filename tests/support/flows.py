"""From plain data, as a YAML reader returns it, to a checked flow and its entries."""

from typing import Any

from flowplan.engine.analysis import Result, analyse
from flowplan.engine.results import Entry
from flowplan.model.base import Axis
from flowplan.model.build import build
from flowplan.model.check import check
from flowplan.model.flow import Flow

Data = dict[str, Any]


def flow_of(data: Data) -> Flow:
    """Build a flow from plain data; anything wrong with it is a fault of the test."""
    flow, findings = build(data)
    assert flow is not None, [d.message for d in findings]
    errors = [d.message for d in check(flow) if d.severity == "error"]
    assert not errors, errors
    return flow


def margins_of(data: Data) -> Result:
    """Analyse plain data."""
    return analyse(flow_of(data))


def entry(result: Result, name: str, axis: Axis = "x") -> Entry:
    """Return the one entry of a pair on an axis."""
    (found,) = [e for e in result.entries if e.pair.name == name and e.axis == axis]
    return found


def overlay_pair(first: str, second: str, **more: Any) -> Data:
    """Return an overlay pair; its name is ``first-second``."""
    return {"name": f"{first}-{second}", "rule": "overlay", "between": [first, second], **more}


def mask(name: str, aligns_to: Any = "wafer", tool: str = "tool", **more: Any) -> Data:
    """Return a mask."""
    return {"id": name, "tool": tool, "aligns_to": aligns_to, **more}


def bare_flow(masks: list[Data], pairs: list[Data], **more: Any) -> Data:
    """Return a flow on one tool without errors of its own, quoted and judged at one sigma."""
    return {
        "flow": "test",
        "sigma": 1,
        "confidence": 1,
        "tools": {"tool": {}},
        "masks": masks,
        "pairs": pairs,
        **more,
    }

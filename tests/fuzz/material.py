"""What the fuzz tests feed to the reader, and what they demand of it."""

import copy
import json
import re
from typing import Any

from hypothesis import strategies as st

from flowplan.api import analyse
from flowplan.engine.analysis import Engine
from flowplan.engine.explain import direct, explain
from flowplan.errors import CODES, FlowError
from flowplan.files.reader import Loaded, parse, parse_bytes
from flowplan.files.resources import resource_folder
from flowplan.report.texttree import tree_lines

LINE_END = re.compile(r"\r\n|[\n\r\x85\u2028\u2029]")
LONGEST_MESSAGE = 300

STARTER = (resource_folder("templates") / "starter.yaml").read_text(encoding="utf-8")

#: Every part of a flow once, small enough to be read thousands of times.
WHOLE: dict[str, Any] = {
    "flow": "Estuary",
    "revision": "B",
    "unit": "nm",
    "sigma": 3,
    "confidence": 3,
    "basis": "mixed",
    "reserve": "10 %",
    "wafer": {"diameter": "100 mm", "edge_exclusion": "5 mm"},
    "field": {"x": "30 mm", "y": "30 mm"},
    "tools": {
        "stepper": {
            "alignment": 90,
            "wafer_alignment": "5 um",
            "terms": {
                "stage": 60,
                "lens": {"random": 45, "enters": "pattern", "common": 0.8},
                "turn": {"random": "2 urad", "shape": "rotation", "over": "field"},
                "scale": {"random": {"x": "1 ppm", "y": "2 ppm"}, "shape": "scale", "over": "wafer"},
            },
        }
    },
    "masks": [
        {"id": "WELL", "title": "n-well", "tool": "stepper", "aligns_to": "wafer"},
        {"id": "GATE", "tool": "stepper", "aligns_to": "WELL", "cd": {"random": 70, "offset": -20}},
        {
            "id": "VIA",
            "tool": "stepper",
            "aligns_to": [{"mask": "GATE", "weight": 0.5}, {"mask": "WELL", "weight": 0.5, "alignment": 7}],
            "side": "back",
            "edge": {"uniform": 9},
            "mark_reading": 30,
            "terms": {"marks": {"bound": 20, "enters": "marks", "source": "etch", "common": "50 %"}},
        },
        {
            "id": "METAL",
            "tool": "stepper",
            "aligns_to": {"x": "VIA", "y": "SD"},
            "terms": {"m": {"bound": 9, "source": "etch"}},
        },
    ],
    "self_aligned": [
        {"id": "SD", "follows": "GATE", "tone": {"x": "opposite", "y": "same"}, "edge": {"random": 15}}
    ],
    "split_layers": {"M": ["VIA", "METAL"]},
    "pairs": [
        {"name": "in", "rule": "enclosure", "inner": "VIA", "outer": "METAL", "drawn": 500, "keep": 0},
        {"name": "past", "rule": "extension", "of": "GATE", "past": "WELL", "drawn": "0.8 um", "axes": "y"},
        {"name": "gap", "rule": "spacing", "between": ["VIA", "GATE"], "drawn": {"x": 700, "y": 9}},
        {"name": "lap", "rule": "overlap", "between": ["GATE", "SD"], "drawn": 90, "keep": 20},
        {"name": "on", "rule": "overlay", "between": ["WELL", "M"], "limit": 350},
    ],
}

HOSTILE = [
    None, True, -1, 0, 1e-320, 1e12, 1e308, 10**60, float("nan"), float("inf"), "", " ", "x", "wafer", "nm",
    "3 furlongs", "1e999 um", "0.5 mm", "-3 ppm", "2 mrad", "7 degC", "100 %", "opposite", "scale", "wafers",
    "\x1b[31m", "a\nb", "\u202eright to left", "\U0001f9ea", "µ", "<script>", "'", '"', "{", "A" * 300,
    [], {}, [[]], {"x": 1}, {"x": 1, "y": "2 um"}, {"mask": "WELL"}, ["WELL", "GATE"], {"random": 3},
    {"random": 1e12, "bound": 1e12, "uniform": 1e12, "offset": -1e12}, {"random": "1 ppm", "shape": "scale"},
]  # fmt: skip


def words(data: Any) -> set[str]:
    """Return every key and text of plain data."""
    if isinstance(data, dict):
        return {str(k) for k in data} | {w for v in data.values() for w in words(v)}
    if isinstance(data, list):
        return {w for v in data for w in words(v)}
    return {data} if isinstance(data, str) else set()


WORDS = sorted(words(WHOLE) | {"uniform", "skew", "magnification", "owner", "notes", "why"})

scalars = (
    st.sampled_from(HOSTILE) | st.sampled_from(WORDS) | st.integers() | st.floats() | st.text(max_size=8)
)
keys = st.sampled_from(WORDS) | st.text(max_size=6)
structures = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(keys, inner, max_size=5),
    max_leaves=25,
)


def places(data: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Return the path of every value below the root of plain data."""
    if isinstance(data, dict):
        inner = [((*path, k), v) for k, v in data.items()]
    elif isinstance(data, list):
        inner = [((*path, i), v) for i, v in enumerate(data)]
    else:
        return []
    return [p for where, value in inner for p in (where, *places(value, where))]


def at(data: Any, path: tuple[Any, ...]) -> Any:
    """Return what stands at a path."""
    for step in path:
        data = data[step]
    return data


@st.composite
def mutants(draw: st.DrawFn, most: int = 4) -> Any:
    """Draw the whole flow with a few keys or values deleted, replaced, moved, copied or renamed."""
    data = copy.deepcopy(WHOLE)
    for _ in range(draw(st.integers(1, most))):
        known = places(data)
        if not known:
            break
        *way, last = draw(st.sampled_from(known))
        parent = at(data, tuple(way))
        change = draw(st.sampled_from(["delete", "replace", "swap", "repeat", "rename", "wrap"]))
        if change == "delete":
            del parent[last]
        elif change == "replace":
            parent[last] = copy.deepcopy(draw(scalars | structures))
        elif change == "swap":
            parent[last] = copy.deepcopy(at(data, draw(st.sampled_from(known))))
        elif change == "wrap":
            parent[last] = draw(st.sampled_from([[parent[last]], {"x": parent[last], "y": parent[last]}]))
        elif isinstance(parent, list):
            parent.insert(0, copy.deepcopy(parent[last]))
        elif change == "rename":
            parent[draw(keys)] = parent.pop(last)
        else:
            parent[f"{last}2"] = copy.deepcopy(parent[last])
    return data


def as_yaml(data: Any) -> str:
    """Write plain data as YAML: JSON, but for the spelling of what is not finite."""
    text = json.dumps(data, indent=1, ensure_ascii=True)
    return re.sub(r"(?<=[ \[])(NaN|-?Infinity)(?=[,\n])", _not_finite, text)


def _not_finite(found: re.Match[str]) -> str:
    return {"NaN": ".nan", "Infinity": ".inf", "-Infinity": "-.inf"}[found.group()]


def read_or_refuse(text: str | bytes) -> Loaded | None:
    """Read a flow; a refusal must be made of sound findings, anything else is a fault."""
    try:
        return parse_bytes(text, "f.yaml") if isinstance(text, bytes) else parse(text, "f.yaml")
    except FlowError as error:
        shown = text.decode("utf-8-sig", "replace") if isinstance(text, bytes) else text
        check_findings(error, shown)
        return None


def check_findings(error: FlowError, text: str) -> None:
    """Demand a known code, a message and a place inside the text, in file order."""
    lines = LINE_END.split(text)
    assert any(d.severity == "error" for d in error.diagnostics)
    spans = []
    for finding in error.diagnostics:
        assert finding.code in CODES
        assert 0 < len(finding.message) <= LONGEST_MESSAGE
        assert len(finding.hint) <= LONGEST_MESSAGE
        span = finding.span
        assert span is not None
        assert 1 <= span.line <= len(lines), finding
        assert 1 <= span.column <= len(lines[span.line - 1]) + 1, finding
        spans.append((span.line, span.column))
    assert spans == sorted(spans)


def work_out(loaded: Loaded) -> None:
    """Demand that everything the reader accepts can be worked out and written as strict JSON."""
    flow = loaded.flow
    analysis = analyse(flow)
    document = json.dumps(analysis.to_document(), allow_nan=False)
    assert len(json.loads(document)["margins"]) == len(analysis.entries)
    assert len(tree_lines(flow)) == len(flow.layers) + 1
    first, *_, last = [*flow.layers, *flow.layers]
    if first != last:
        engine = Engine.of(flow)
        explain(engine, first, last, "x")
        direct(engine, first, last, "y")

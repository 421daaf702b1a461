"""What the example flows share: sound, in one invented scenario, and together using every feature."""

import json
from pathlib import Path

import pytest

from flowplan.api import load_with_warnings
from flowplan.files.yamltext import read_yaml
from flowplan.model.base import AXES
from flowplan.model.schema import flow_schema
from flowplan.model.terms import KINDS, SHAPE_DIMENSION

FLOWS = Path(__file__).resolve().parents[2] / "flows"
NAMES = ["cmos", "ebeam_transistor", "logic_backend", "photonic", "pressure_sensor", "redistribution"]
ROLES = {"assembly", "device", "e-beam", "integration", "litho", "packaging", "photonics"}


@pytest.fixture(scope="module")
def loaded():
    return {name: load_with_warnings(FLOWS / f"{name}.yaml") for name in NAMES}


def terms_of(flow):
    return [t for part in (*flow.tools.values(), *flow.masks) for t in part.terms.values()]


def test_there_are_these_examples():
    assert sorted(file.stem for file in FLOWS.glob("*.yaml")) == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_flow_loads_without_warnings(loaded, name):
    assert loaded[name].warnings == ()


@pytest.mark.parametrize("name", NAMES)
def test_first_line_points_editors_at_the_schema(name):
    first = (FLOWS / f"{name}.yaml").read_text(encoding="utf-8").splitlines()[0]
    assert first == "# yaml-language-server: $schema=flow.schema.json"


def test_schema_file_is_current():
    """Write it anew with: flowplan schema -o flows/flow.schema.json."""
    assert json.loads((FLOWS / "flow.schema.json").read_text(encoding="utf-8")) == flow_schema()


@pytest.mark.parametrize("name", NAMES)
def test_flow_plays_in_the_invented_scenario(loaded, name):
    """The pilot line is Estuary, owners are roles, and the head says that nothing was measured."""
    flow = loaded[name].flow
    parts = (flow, *flow.tools.values(), *flow.masks, *flow.self_aligned, *flow.pairs)
    head = (FLOWS / f"{name}.yaml").read_text(encoding="utf-8").split("\nflow:")[0]
    assert flow.flow.startswith("Estuary ")
    assert {part.owner for part in parts if part.owner} <= ROLES
    assert 'invented pilot line "Estuary"' in " ".join(head.replace("#", " ").split())
    assert "Nothing here was measured anywhere" in " ".join(head.replace("#", " ").split())


@pytest.mark.parametrize("name", NAMES)
def test_flow_reads_well_in_the_report(loaded, name):
    """Flow, tools, masks and features carry the titles and owners that the handoff table shows."""
    flow = loaded[name].flow
    assert flow.revision
    assert flow.notes
    assert flow.owner
    assert all(part.title for part in (*flow.tools.values(), *flow.masks, *flow.self_aligned))
    assert all(tool.owner for tool in flow.tools.values())


@pytest.mark.parametrize("name", NAMES)
def test_every_size_of_a_tool_says_where_it_comes_from(name):
    """Each number under `tools:` has a mark (a), (a*), (b) or (c) on its line or in its block."""
    text = (FLOWS / f"{name}.yaml").read_text(encoding="utf-8")
    tools = text[text.index("\ntools:") : text.index("\nmasks:")].splitlines()
    sizes = [line for line in tools if any(f"{kind}:" in line for kind in (*KINDS, "alignment"))]
    assert sizes
    assert [line for line in sizes if not any(m in line for m in ("(a)", "(a*)", "(b)", "(c)"))] == []


@pytest.mark.parametrize(
    ("name", "masks", "pairs"),
    [
        ("cmos", range(12, 16), range(15, 26)),
        ("ebeam_transistor", range(10, 20), range(15, 26)),
        ("logic_backend", range(45, 60), range(60, 121)),
        ("photonic", range(10, 25), range(15, 40)),
        ("pressure_sensor", range(6, 12), range(10, 26)),
        ("redistribution", range(6, 12), range(10, 26)),
    ],
)
def test_flow_has_a_realistic_size(loaded, name, masks, pairs):
    flow = loaded[name].flow
    assert len(flow.masks) in masks
    assert len(flow.pairs) in pairs


def test_units_are_as_the_trade_writes_them(loaded):
    units = {name: loaded[name].flow.unit for name in NAMES}
    assert {name for name, unit in units.items() if unit == "um"} == {"pressure_sensor", "redistribution"}


def test_examples_use_every_rule_kind_and_shape(loaded):
    flows = [one.flow for one in loaded.values()]
    terms = [t for flow in flows for t in terms_of(flow)]
    assert {p.rule for flow in flows for p in flow.pairs} == {
        "enclosure", "extension", "spacing", "overlap", "overlay", "landing",
    }  # fmt: skip
    assert {kind for t in terms for kind, _ in t.parts()} == set(KINDS)
    assert {t.shape for t in terms} == set(SHAPE_DIMENSION)
    assert {t.over for t in terms if t.shape != "shift"} == {"field", "wafer"}
    assert {t.enters for t in terms} == {"layer", "pattern", "marks"}
    assert any(t.source for t in terms)
    assert any(t.common not in (None, 1.0) for t in terms)


def test_examples_use_every_way_to_align(loaded):
    flows = [one.flow for one in loaded.values()]
    masks = [m for flow in flows for m in flow.masks]
    readings = [r for m in masks for axis in AXES for r in m.aligns_to.on(axis)]
    assert any(m.mark_reading for m in masks)
    assert any(r.alignment for r in readings)
    assert any(r.weight not in (None, 0.5) for r in readings)
    assert any(m.aligns_to.x != m.aligns_to.y for m in masks)
    assert any(len(m.aligns_to.x) > 1 for m in masks)
    assert any(m.side == "back" for m in masks)
    assert any(f.tone.sign("x") == -1 for flow in flows for f in flow.self_aligned)
    assert any(flow.split_layers for flow in flows)


def test_sensor_has_one_mask_on_the_back(loaded):
    sensor = loaded["pressure_sensor"].flow
    assert [m.id for m in sensor.masks if m.side == "back"] == ["CAVITY"]


@pytest.mark.parametrize("name", NAMES)
def test_no_key_is_left_over_from_yaml(name):
    """A comma in an unquoted text of a flow mapping would make a key without a value."""
    data, _ = read_yaml((FLOWS / f"{name}.yaml").read_text(encoding="utf-8"), name)

    def empty_values(part):
        values = part.values() if isinstance(part, dict) else part if isinstance(part, list) else ()
        return sum(v is None or empty_values(v) for v in values)

    assert empty_values(data) == 0

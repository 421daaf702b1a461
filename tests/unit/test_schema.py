"""The JSON Schema accepts what the reader accepts, refuses unknown keys, and describes every field."""

import copy
from typing import Any

import jsonschema
import pytest

from flowplan.files.resources import resource_folder
from flowplan.files.yamltext import read_yaml
from flowplan.model.build import build
from flowplan.model.schema import flow_schema

FLOWS = sorted(resource_folder("flows").glob("*.yaml"))


@pytest.fixture(scope="module")
def validator():
    return jsonschema.Draft202012Validator(flow_schema())


def base() -> dict[str, Any]:
    return {
        "flow": "Estuary",
        "tools": {"s": {"alignment": 30, "terms": {"t": 3}}},
        "masks": [
            {"id": "A", "tool": "s", "aligns_to": "wafer"},
            {"id": "B", "tool": "s", "aligns_to": "A"},
            {"id": "C", "tool": "s", "aligns_to": "A"},
        ],
        "self_aligned": [{"id": "S", "follows": "B"}],
        "pairs": [{"rule": "enclosure", "inner": "A", "outer": "B", "drawn": 3}],
    }


def with_value(path: tuple[str | int, ...], value: object) -> dict[str, Any]:
    data = copy.deepcopy(base())
    place: Any = data
    for step in path[:-1]:
        place = place[step]
    place[path[-1]] = value
    return data


TERM = ("tools", "s", "terms", "t")
ALIGNS = ("masks", 2, "aligns_to")
DRAWN = ("pairs", 0, "drawn")

ACCEPTED = [
    *(
        (DRAWN, value)
        for value in (3, 0.5, "3", "0.12 um", "3nm", "1e2 nm", " .5 mm ", {"x": 3, "y": "4 um"})
    ),
    *((DRAWN, f"3 {sign}m") for sign in ("\N{MICRO SIGN}", "\N{GREEK SMALL LETTER MU}")),
    *((("pairs", 0, "keep"), value) for value in (-3, "-3 nm")),
    *((TERM, value) for value in (3, "3 nm", {"x": 3, "y": 4}, {"random": 3}, {"random": {"x": 3, "y": 4}})),
    (TERM, {"uniform": 3, "bound": "2 nm", "offset": -1, "enters": "marks", "notes": "why"}),
    *((TERM, {"random": 3, "common": share}) for share in (0, 1, 0.8, "80 %", "80%", ".5 %", "1e1 %")),
    (TERM, {"random": 3, "source": "lens"}),
    *((ALIGNS, value) for value in ("wafer", {"mask": "A"}, {"mask": "A", "alignment": {"bound": 3}})),
    *((ALIGNS, value) for value in (["A"], ["A", "B"], {"x": "A", "y": "B"}, {"x": ["A", "B"], "y": "A"})),
    (ALIGNS, [{"mask": "A", "weight": 0.5}, {"mask": "B", "weight": 0.5, "alignment": 3}]),
    (ALIGNS, {"x": {"mask": "A", "alignment": "3 nm"}, "y": [{"mask": "A"}]}),
    (("self_aligned", 0, "follows"), {"x": "A", "y": "B"}),
    (("self_aligned", 0, "tone"), "opposite"),
    (("self_aligned", 0, "tone"), {"x": "opposite", "y": "same"}),
    (("self_aligned", 0, "tone"), {"x": "opposite"}),
    (("self_aligned", 0, "edge"), {"random": 3}),
    (("masks", 0, "cd"), None),
    (("masks", 0, "side"), "back"),
    (("unit",), "\N{MICRO SIGN}m"),
    (("reserve",), "10 %"),
    (("wafer",), {"diameter": "150 mm"}),
    (("field",), {"x": "15 mm", "y": 3}),
    (("split_layers",), {"AB": ["A", "B"]}),
    (("pairs",), [{"rule": "overlay", "between": ["A", "B"]}]),
    (("pairs",), [{"rule": "overlay", "between": ["A", "B"], "limit": {"x": 3, "y": 4}}]),
    (("pairs",), []),
]


@pytest.mark.parametrize(("path", "value"), ACCEPTED, ids=str)
def test_every_shorthand_that_the_reader_accepts_is_accepted(validator, path, value):
    data = with_value(path, value)
    _, findings = build(data)
    assert [d.message for d in findings] == []
    assert [e.message for e in validator.iter_errors(data)] == []


REFUSED = [
    (("wafr",), 3),
    (("masks", 0, "xyz"), 3),
    (("tools", "s", "speed"), 3),
    (TERM, {"random": 3, "size": 4}),
    (TERM, {"random": 3, "shape": "wave"}),
    (ALIGNS, {"mask": "A", "weigth": 1}),
    (ALIGNS, []),
    (ALIGNS, 3),
    (DRAWN, {"x": 3}),
    (DRAWN, "3 furlongs"),
    (DRAWN, True),
    (("pairs", 0, "inside"), "A"),
    (("pairs",), [{"rule": "spacing", "between": ["A"], "drawn": 3}]),
    (("pairs",), [{"rule": "enclosed", "between": ["A", "B"], "drawn": 3}]),
    (("unit",), "urad"),
    (("reserve",), 2),
    (("sigma",), 0),
    (("sigma",), "3"),
    (("flow",), ""),
    (("self_aligned", 0, "tone"), "inverse"),
]


@pytest.mark.parametrize(("path", "value"), REFUSED, ids=str)
def test_unknown_keys_and_words_are_refused_by_both(validator, path, value):
    data = with_value(path, value)
    assert build(data)[0] is None
    assert not validator.is_valid(data)


@pytest.mark.parametrize("file", FLOWS, ids=lambda file: file.stem)
def test_the_example_flows_are_accepted(validator, file):
    data, _ = read_yaml(file.read_text(encoding="utf-8"), file.name)
    assert [e.message for e in validator.iter_errors(data)] == []


def fields(node: object, where: str = "flow"):
    """Yield (place, field) of every property of the schema."""
    if isinstance(node, dict):
        for name, field in node.get("properties", {}).items():
            yield f"{where}.{name}", field
        for key, value in node.items():
            yield from fields(value, f"{where}.{key}")
    elif isinstance(node, list):
        for i, value in enumerate(node):
            yield from fields(value, f"{where}.{i}")


def test_every_field_has_a_description():
    found = dict(fields(flow_schema()))
    assert len(found) > 80
    assert [place for place, field in found.items() if not field.get("description")] == []


def test_no_default_shows_the_inside_of_the_program():
    defaults = [field["default"] for _, field in fields(flow_schema()) if "default" in field]
    assert defaults
    assert all(not (isinstance(d, dict) and "unit" in d) for d in defaults)


def test_the_schema_says_what_it_is():
    schema = flow_schema()
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert schema["title"] == "flowplan flow file"
    jsonschema.Draft202012Validator.check_schema(schema)

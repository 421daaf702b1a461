"""The flow file as a JSON Schema, for completion and checks in an editor."""

import copy
from typing import Any

from flowplan.model.flow import Flow
from flowplan.model.variants import AFTER, KEYED_LISTS

DIALECT = "https://json-schema.org/draft/2020-12/schema"

Schema = dict[str, Any]

#: What stands under each part of a variant: the models that it changes in parts.
_CHANGED = {
    "tools": ("Tool",),
    "masks": ("Mask",),
    "self_aligned": ("SelfAligned",),
    "pairs": ("Enclosure", "Extension", "Spacing", "Overlap", "Overlay", "Landing"),
}


def flow_schema() -> Schema:
    """Return the JSON Schema of a flow file.

    Returns
    -------
    dict
        Draft 2020-12. It knows the form of a flow, every shorthand included; what spans several
        parts, such as unknown ids, only the reader finds.
    """
    schema = Flow.model_json_schema()
    _describe_variants(schema)
    return {"$schema": DIALECT, **schema, "title": "flowplan flow file"}


def _describe_variants(schema: Schema) -> None:
    """Replace the open parts of a variant by the forms of what they change, nothing required."""
    parts = schema["$defs"]["Variant"]["properties"]
    for part, models in _CHANGED.items():
        changes = [_in_parts(schema["$defs"][model], KEYED_LISTS.get(part)) for model in models]
        one = _merged(changes)
        if part == "masks":
            one["properties"][AFTER] = {
                "type": "string",
                "description": "The mask that a new mask comes after.",
            }
        entries: list[Schema] = [{"type": "object", "additionalProperties": one}]
        if part in KEYED_LISTS:
            entries.append({"type": "array", "items": one})
        parts[part] = {"description": parts[part]["description"], "anyOf": entries}
    for key in parts:
        if key in schema["properties"] and key not in _CHANGED:
            described = copy.deepcopy(schema["properties"][key])
            parts[key] = described | {"description": parts[key]["description"]}
            parts[key].pop("default", None)
    for name in ("wafer", "field"):
        model = {"wafer": "Wafer", "field": "ExposureField"}[name]
        parts[name] = _in_parts(schema["$defs"][model], None) | {"description": parts[name]["description"]}


def _in_parts(model: Schema, key: str | None) -> Schema:
    """Return a model of which any part may be given, or null to take it away."""
    changed = copy.deepcopy(model)
    changed.pop("required", None)
    changed["properties"] = {
        name: part if name == key else _or_null(part) for name, part in changed["properties"].items()
    }
    return changed


def _or_null(part: Schema) -> Schema:
    described = {"description": part["description"]} if "description" in part else {}
    return {"anyOf": [part, {"type": "null"}]} | described


def _merged(models: list[Schema]) -> Schema:
    """Return one model that takes the keys of several."""
    first, *others = models
    for other in others:
        for name, part in other["properties"].items():
            known = first["properties"].setdefault(name, part)
            if known != part:
                first["properties"][name] = {"anyOf": [known, part], "description": known["description"]}
    return first

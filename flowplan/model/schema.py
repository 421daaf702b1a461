"""The flow file as a JSON Schema, for completion and checks in an editor."""

from typing import Any

from flowplan.model.flow import Flow

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def flow_schema() -> dict[str, Any]:
    """Return the JSON Schema of a flow file.

    Returns
    -------
    dict
        Draft 2020-12. It knows the form of a flow, every shorthand included; what spans several
        parts, such as unknown ids, only the reader finds.
    """
    schema = Flow.model_json_schema()
    return {"$schema": DIALECT, **schema, "title": "flowplan flow file"}

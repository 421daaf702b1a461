"""``flowplan schema``: what may stand in a flow file, for editors."""

import json

from flowplan.cli.output import write_output
from flowplan.cli.streams import emit_json, printable, tell
from flowplan.model.schema import flow_schema


def schema(output: str | None) -> None:
    """Print the JSON Schema of a flow file, or write it to a file."""
    if output is None:
        emit_json(flow_schema())
        return
    write_output(output, json.dumps(flow_schema(), indent=2, ensure_ascii=False) + "\n")
    tell(f"wrote {printable(output)}")

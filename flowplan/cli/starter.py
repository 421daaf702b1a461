"""``flowplan new``: a starter flow, commented, to change into one's own."""

from pathlib import Path

from flowplan.cli.session import STDIN
from flowplan.cli.streams import emit, printable, tell
from flowplan.errors import Diagnostic, OutputError
from flowplan.files.resources import resource_folder
from flowplan.files.writer import write_atomically

SCHEMA_FILE = "flow.schema.json"


def new(output: str, *, force: bool) -> None:
    """Write the starter flow, and say what to do with it."""
    text = (resource_folder("templates") / "starter.yaml").read_text(encoding="utf-8")
    if output == STDIN:
        emit(text.rstrip("\n"))
        return
    target = Path(output)
    if target.exists() and not force:
        hint = "name another file, or give --force to replace it"
        raise OutputError([Diagnostic("FP501", f"{output!r} exists already", hint)])
    write_atomically(target, text)
    shown = printable(output)
    tell(f"wrote {shown}")
    tell(f"next: flowplan check {shown}")
    tell(f"for completion in your editor: flowplan schema -o {printable(str(target.with_name(SCHEMA_FILE)))}")

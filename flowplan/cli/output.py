"""Writing a result to a file that the user named."""

from pathlib import Path

from flowplan.cli.session import STDIN
from flowplan.errors import Diagnostic, OutputError
from flowplan.files.writer import refuse_unwritable, write_atomically


def write_output(output: str, content: str | bytes, *, flow: str | None = None) -> None:
    """Write a file whole or not at all, never over the flow that it comes from.

    Raises
    ------
    OutputError
        FP501, when the file cannot be written or is the flow file itself.
    """
    refuse_output(output, flow)
    write_atomically(output, content)


def refuse_output(output: str, flow: str | None = None) -> None:
    """Refuse a file that could not be written, or is the flow itself, before the work begins.

    Raises
    ------
    OutputError
        FP501, as `write_output` would raise it.
    """
    refuse_flow_as_output(output, flow)
    refuse_unwritable(output)


def refuse_flow_as_output(output: str, flow: str | None) -> None:
    """Refuse to write over the flow file, by whatever name it is called."""
    if flow is None or flow == STDIN:
        return
    try:
        same = Path(output).samefile(flow)
    except (OSError, ValueError):
        return
    if same:
        hint = "name another file with -o"
        raise OutputError([Diagnostic("FP501", f"{output!r} is the flow file itself", hint)])

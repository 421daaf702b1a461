"""What every command shares: its arguments, reading the flow, and how it ends."""

import functools
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, Any

import typer

from flowplan.cli.findings import count_findings, show_findings
from flowplan.cli.status import Status
from flowplan.cli.streams import printable, tell
from flowplan.errors import Diagnostic, FlowError, FlowplanError, Span, UsageError, nearest
from flowplan.model.base import WAFER
from flowplan.model.flow import Flow

if TYPE_CHECKING:
    from flowplan.files.reader import Loaded

#: Set to anything to see the whole trace of an unforeseen fault.
DEBUG = "FLOWPLAN_DEBUG"
STDIN = "-"

FlowArgument = Annotated[
    str,
    typer.Argument(metavar="FLOW", help="The flow file (YAML); - reads standard input.", show_default=False),
]
VariantOption = Annotated[
    str | None,
    typer.Option("--variant", metavar="NAME", help="Take this variant of the flow.", show_default=False),
]
StrictOption = Annotated[bool, typer.Option("--strict", help="Exit with status 1 if a pair fails.")]


@dataclass(frozen=True, slots=True)
class Opened:
    """A flow that was read, its variants by name, and what was found on the way."""

    loaded: "Loaded"
    flow: Flow
    text: str

    @property
    def warnings(self) -> tuple[Diagnostic, ...]:
        """What was found that does not stop the work."""
        return self.loaded.warnings

    @property
    def variants(self) -> dict[str, Flow]:
        """The file's variants by name."""
        return self.loaded.variants

    def plan(self, variant: str) -> Flow:
        """Return one of the file's variants; see `Loaded.plan`."""
        return self.loaded.plan(variant)

    def show_warnings(self) -> None:
        """Print the warnings on standard error."""
        show_findings(self.warnings, self.text)


class RefusedError(FlowError):
    """A flow with errors, together with its text."""

    def __init__(self, error: FlowError, text: str) -> None:
        super().__init__(error.diagnostics)
        self.text = text


def open_flow(name: str, variant: str | None = None) -> Opened:
    """Read a flow file, or standard input for ``-``, and take one of its plans.

    Raises
    ------
    UsageError
        FP602, for an empty name; FP605, for a variant that the file does not have.
    RefusedError
        When the flow is at fault; holds the text for showing the places.
    """
    from flowplan.files.inputfile import MOST_BYTES, read_bytes
    from flowplan.files.reader import parse_bytes

    if not name.strip():
        raise UsageError(
            [Diagnostic("FP602", "no flow file is named", "`flowplan new` writes a starter flow")]
        )
    if name == STDIN:
        name, raw = "<stdin>", _read_stdin(MOST_BYTES + 1)
    else:
        raw = read_bytes(name)
    text = raw.decode("utf-8-sig", "replace")
    try:
        loaded = parse_bytes(raw, name)
    except FlowError as error:
        raise RefusedError(error, text) from None
    return Opened(loaded, loaded.plan(variant), text)


def _read_stdin(most: int) -> bytes:
    """Return what standard input holds; a shell may have closed it."""
    if sys.stdin is None:
        hint = "give it a flow, or name a file"
        raise FlowError([Diagnostic("FP101", "standard input is closed", hint, span=Span("<stdin>", 1, 1))])
    return sys.stdin.buffer.read(most)


def read_flow(name: str, variant: str | None = None) -> Flow:
    """Read a flow, or one of its variants, and show its warnings."""
    opened = open_flow(name, variant)
    opened.show_warnings()
    return opened.flow


def known_layer(flow: Flow, name: str, *, wafer: bool = False, split: bool = False) -> str:
    """Return a layer's name as asked for on the command line, or refuse it.

    Parameters
    ----------
    flow : Flow
        The flow.
    name : str
        What was asked for.
    wafer, split : bool
        Whether the wafer, or a split layer, is an answer too.

    Raises
    ------
    UsageError
        FP601, naming the nearest layer; FP602 for a split layer where one mask is wanted.
    """
    if name in flow.layers or (wafer and name == WAFER) or (split and name in flow.split_layers):
        return name
    if name in flow.split_layers:
        hint = "name one of " + ", ".join(flow.split_layers[name])
        raise UsageError([Diagnostic("FP602", f"{name!r} is a split layer, not one mask", hint)])
    known = [*flow.layers, *(flow.split_layers if split else ())]
    raise UsageError([Diagnostic("FP601", f"unknown layer {name!r}", nearest(name, known))])


def guarded(command: Callable[..., None]) -> Callable[..., None]:
    """Let a command end with a clear message and status, never with a traceback."""

    @functools.wraps(command)
    def run(*args: Any, **kwargs: Any) -> None:
        try:
            command(*args, **kwargs)
        except FlowplanError as error:
            show_findings(error.diagnostics, getattr(error, "text", None))
            if len(error.diagnostics) > 1:
                tell(count_findings(error.diagnostics))
            raise typer.Exit(Status.INPUT) from None
        except typer.Exit:
            raise
        except Exception as fault:
            if os.environ.get(DEBUG):
                raise
            what = printable(f"{type(fault).__name__}: {fault}")[:200]
            tell(f"flowplan: unforeseen fault: {what} (set {DEBUG}=1 to see where)")
            raise typer.Exit(Status.INPUT) from None

    return run

"""Standard output for data, standard error for everything else; safe for any terminal or pipe."""

import json
import os
import sys
from typing import Any, TextIO

from flowplan.errors import Diagnostic, OutputError

#: What output that is not UTF-8 gets instead of the signs flowplan uses.
_PLAIN = str.maketrans(
    {
        "→": "->", "±": "+/-", "µ": "u", "σ": "sigma", "·": "-", "…": "...", "×": "x", "²": "^2",
        "├": "|", "└": "`", "─": "-", "│": "|",
    }
)  # fmt: skip


def emit(text: str) -> None:
    """Print data on standard output."""
    _write(sys.stdout, text)


def emit_json(document: Any) -> None:
    """Print data as JSON, escaped where the output is not UTF-8."""
    plain = not is_unicode(sys.stdout)
    emit(json.dumps(document, indent=2, ensure_ascii=plain, allow_nan=False))


def tell(text: str) -> None:
    """Print a message on standard error."""
    _write(sys.stderr, text)


def is_unicode(stream: TextIO) -> bool:
    """Whether the stream can carry every sign."""
    return (getattr(stream, "encoding", None) or "ascii").lower().replace("-", "").startswith("utf")


def has_colour(stream: TextIO) -> bool:
    """Whether the stream is a terminal that shows styles."""
    plain = os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb"
    return stream.isatty() and not plain


def printable(text: str) -> str:
    """Return text on one line, control characters spelled out, so that no terminal obeys them."""
    return "".join(c if c.isprintable() else " " if c.isspace() else repr(c)[1:-1] for c in text)


def _write(stream: TextIO, text: str) -> None:
    """Write a text and a line end; whoever closed the pipe does not want to hear about it."""
    if not is_unicode(stream):
        text = text.translate(_PLAIN)
    encoding = getattr(stream, "encoding", None) or "ascii"
    text = text.encode(encoding, "backslashreplace").decode(encoding)
    try:
        stream.write(text + "\n")
        stream.flush()
    except OSError as error:
        os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())  # what is still buffered goes nowhere
        if not isinstance(error, BrokenPipeError):
            message = f"cannot write {stream.name}: {error.strerror}"
            raise OutputError([Diagnostic("FP501", message)]) from None

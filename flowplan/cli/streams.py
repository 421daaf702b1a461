"""Standard output for data, standard error for everything else; safe for any terminal or pipe."""

import json
import os
import re
import shutil
import sys
import textwrap
from typing import Any, TextIO

from flowplan.errors import Diagnostic, OutputError

#: What a JSON text may hold as it is, but a terminal may obey: outside ASCII, and not printable.
_UNSEEN = re.compile(r"[\x7f-\xa0\xad\u0600-\u0605\u061c\u180e\u200b-\u200f\u2028-\u202e\u2060-\u206f\ufeff]")
#: Width of what is not a terminal.
PIPE_WIDTH = 80

#: What output that is not UTF-8 gets instead of the signs flowplan uses.
_PLAIN = str.maketrans(
    {
        "→": "->", "±": "+/-", "µ": "u", "σ": "sigma", "·": "-", "…": "...", "×": "x", "²": "^2",
        "├": "|", "└": "`", "─": "-", "│": "|",
    }
)  # fmt: skip


def emit(text: str) -> None:
    """Print data on standard output."""
    if sys.stdout is None:
        raise OutputError([Diagnostic("FP501", "standard output is closed")])
    _write(sys.stdout, text)


def emit_json(document: Any) -> None:
    """Print data as JSON, escaped where the output is not UTF-8."""
    plain = not is_unicode(sys.stdout)
    text = json.dumps(document, indent=2, ensure_ascii=plain, allow_nan=False)
    emit(text if plain else _UNSEEN.sub(_escaped, text))


def tell(text: str) -> None:
    """Print a message on standard error, if there is one."""
    if sys.stderr is not None:
        _write(sys.stderr, text)


def is_unicode(stream: TextIO) -> bool:
    """Whether the stream can carry every sign."""
    return (getattr(stream, "encoding", None) or "ascii").lower().replace("-", "").startswith("utf")


def has_colour(stream: TextIO | None) -> bool:
    """Whether the stream is a terminal that shows styles."""
    if stream is None:
        return False
    plain = os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb"
    return stream.isatty() and not plain


def printable(text: str) -> str:
    """Return text on one line, control characters spelled out, so that no terminal obeys them."""
    return "".join(c if c.isprintable() else " " if c.isspace() else repr(c)[1:-1] for c in text)


def width() -> int:
    """Return how many columns standard output has: a terminal's, or 80."""
    terminal = sys.stdout is not None and sys.stdout.isatty()
    return shutil.get_terminal_size().columns if terminal else PIPE_WIDTH


def folded(text: str, hanging: int = 0) -> str:
    """Return a line broken where it overruns the width.

    Parameters
    ----------
    text : str
        One printable line, which may begin with spaces.
    hanging : int
        Spaces before each further line.
    """
    columns = width()
    if len(text) <= columns:
        return text
    wrapped = textwrap.wrap(
        text, max(columns, 2 * hanging + 1), subsequent_indent=" " * hanging, break_on_hyphens=False
    )
    return "\n".join(wrapped)


def _escaped(found: re.Match[str]) -> str:
    return f"\\u{ord(found.group()):04x}"


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

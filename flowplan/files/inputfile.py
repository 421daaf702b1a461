"""The bytes and the text of a flow file, whatever the name turns out to stand for."""

import codecs
import os
import stat
import time
from pathlib import Path as FilePath

from flowplan.errors import Diagnostic, FlowError, Span
from flowplan.files.syntax import span_at

#: A flow of several hundred masks stays well below this [bytes].
MOST_BYTES = 4_000_000
#: A pipe that stays silent this long is given up [s].
PATIENCE = 60.0

_BLOCK = 65_536
_UTF16_MARKS = (codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)


def read_bytes(file: str | os.PathLike[str]) -> bytes:
    """Return the bytes of a file or a pipe, cut off just after `MOST_BYTES`.

    Parameters
    ----------
    file : path-like
        A file, a link to one, or a pipe such as a shell's ``<(command)``.

    Returns
    -------
    bytes
        At most ``MOST_BYTES + 1`` of them.

    Raises
    ------
    FlowError
        FP101, when there is nothing to read: a folder, a device, a pipe nobody writes to, a missing
        or unreadable file.
    """
    path, name = FilePath(file), os.fspath(file)
    try:
        mode = path.stat().st_mode
        if stat.S_ISDIR(mode):
            raise _cannot(name, "is a folder, not a flow file", "name a file in it")
        if stat.S_ISCHR(mode) or stat.S_ISBLK(mode):
            raise _cannot(name, "is a device, not a flow file", "`-` reads standard input")
        if stat.S_ISFIFO(mode):
            return _read_pipe(path, name)
        with path.open("rb") as stream:
            return stream.read(MOST_BYTES + 1)
    except FileNotFoundError:
        raise _cannot(name, "no such file", "check the name; `flowplan new` writes one") from None
    except PermissionError:
        raise _cannot(name, "may not be read", "check its permissions") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _cannot(name, f"cannot be read: {reason}", "check the name and the disk") from None


def _read_pipe(path: FilePath, name: str) -> bytes:
    """Read a pipe without ever waiting for a writer that does not come."""
    handle = os.open(path, os.O_RDONLY | os.O_NONBLOCK)
    try:
        parts: list[bytes] = []
        last = time.monotonic()
        while sum(map(len, parts)) <= MOST_BYTES:
            try:
                part = os.read(handle, _BLOCK)
            except BlockingIOError:
                if time.monotonic() - last > PATIENCE:
                    raise _cannot(name, "a pipe from which nothing comes", "is its writer alive?") from None
                time.sleep(0.01)
                continue
            if not part:
                break
            parts.append(part)
            last = time.monotonic()
    finally:
        os.close(handle)
    if not parts:
        raise _cannot(name, "a pipe that nobody writes to", "start what writes the flow first")
    return b"".join(parts)[: MOST_BYTES + 1]


def decode(raw: bytes, name: str) -> str:
    """Return the text of a flow file.

    Parameters
    ----------
    raw : bytes
        The bytes of a file; a byte order mark of UTF-8 is taken off.
    name : str
        What diagnostics call the file.

    Returns
    -------
    str
        The text.

    Raises
    ------
    FlowError
        FP103 for more than `MOST_BYTES`, FP102 for what is not UTF-8 text.
    """
    start = Span(name, 1, 1)
    if len(raw) > MOST_BYTES:
        message = f"larger than {MOST_BYTES // 1_000_000} MB, which no flow file needs"
        raise FlowError([Diagnostic("FP103", message, "is this the right file?", span=start)])
    if raw.startswith(_UTF16_MARKS):
        raise FlowError([Diagnostic("FP102", "UTF-16 text, not UTF-8", "save the file as UTF-8", span=start)])
    if b"\0" in raw:
        message = "not text: it holds zero bytes"
        raise FlowError(
            [Diagnostic("FP102", message, "is this the right file? save it as UTF-8", span=start)]
        )
    raw = raw.removeprefix(codecs.BOM_UTF8)
    try:
        return raw.decode()
    except UnicodeDecodeError as error:
        before = raw[: error.start].decode()
        span = span_at(before + "?", len(before), name)
        message = f"not UTF-8 text: the byte {raw[error.start]:02X} (hexadecimal)"
        raise FlowError([Diagnostic("FP102", message, "save the file as UTF-8", span=span)]) from None


def _cannot(name: str, message: str, hint: str) -> FlowError:
    return FlowError([Diagnostic("FP101", message, hint, span=Span(name, 1, 1))])

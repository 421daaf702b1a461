"""Writing results: whole or not at all."""

import errno
import os
import tempfile
from pathlib import Path

from flowplan.errors import Diagnostic, OutputError


def write_atomically(file: str | os.PathLike[str], content: str | bytes) -> None:
    """Write a file so that a failure leaves the old one whole.

    Parameters
    ----------
    file : path-like
        Where the content goes; the folder must exist. A link is followed; a device or a pipe is
        written to.
    content : str or bytes
        Text is written as UTF-8.

    Raises
    ------
    OutputError
        FP501, when the folder does not exist or cannot be written.
    """
    raw = content.encode("utf-8") if isinstance(content, str) else content
    try:
        target = _target(file)
        if _is_stream(target):
            target.write_bytes(raw)  # a device or a pipe is written to, never replaced
        else:
            _replace(target, raw)
    except (OSError, ValueError) as error:
        raise _refused(file, error) from None


def refuse_unwritable(file: str | os.PathLike[str]) -> None:
    """Refuse what `write_atomically` could not write, before the work is done that it would hold.

    Raises
    ------
    OutputError
        FP501, for a folder, or a name in a folder that does not exist or cannot be written.
    """
    try:
        target = _target(file)
        if not target.exists():
            target.parent.stat()
        allowed = (
            os.access(target, os.W_OK) if _is_stream(target) else os.access(target.parent, os.W_OK | os.X_OK)
        )
        if not allowed:
            raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))
    except (OSError, ValueError) as error:
        raise _refused(file, error) from None


def _target(file: str | os.PathLike[str]) -> Path:
    named = Path(file)
    target = named if _is_stream(named) else named.resolve()
    if target.is_dir():
        raise IsADirectoryError(errno.EISDIR, "is a folder")
    return target


def _is_stream(path: Path) -> bool:
    """Whether a name stands for a device or a pipe, such as what ``/dev/stdout`` leads to."""
    return path.exists() and not path.is_file() and not path.is_dir()


def _refused(file: str | os.PathLike[str], error: OSError | ValueError) -> OutputError:
    reason = getattr(error, "strerror", None) or str(error)
    hint = "name a file in a folder that exists and can be written"
    message = f"cannot write {os.fspath(file)!r}: {reason}"
    return OutputError([Diagnostic("FP501", message, hint)])


def _replace(target: Path, raw: bytes) -> None:
    """Write beside the target, then put it in the target's place in one step."""
    handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name[:100]}.")
    temporary = Path(name)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(raw)
            stream.flush()
            os.fsync(stream.fileno())
        temporary.chmod(_mode(target))
        temporary.replace(target)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def _mode(target: Path) -> int:
    """Permissions of the file that is replaced, else those a new file would get."""
    if target.exists():
        return target.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask

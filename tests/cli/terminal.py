"""Commands on a terminal of their own."""

import os
import pty
import subprocess
import sys
from pathlib import Path

FLOWPLAN = [sys.executable, "-m", "flowplan"]


def on_a_terminal(*command: str, cwd: Path, columns: int = 80, **environment: str) -> str:
    """Return what a command prints on a terminal of some width."""
    inside, outside = pty.openpty()
    env = {**os.environ, "TERM": "xterm-256color", "COLUMNS": str(columns), **environment}
    if "NO_COLOR" not in environment:
        env.pop("NO_COLOR", None)
    done = subprocess.Popen(list(command), cwd=cwd, stdout=outside, stderr=outside, env=env)
    os.close(outside)
    text = b""
    try:
        while part := os.read(inside, 65536):
            text += part
    except OSError:  # the terminal is closed when the command ends
        pass
    os.close(inside)
    assert done.wait() == 0
    return text.decode().replace("\r\n", "\n")

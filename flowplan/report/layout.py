"""Drawing DOT text with Graphviz, in a process of its own.

Graphviz and the font libraries that come with it write remarks about the machine's fonts straight to
the error stream, and a fault in them would end the whole program. A child process keeps both away from
the caller, and touches neither its environment nor its file descriptors. The child runs this file.
"""

import subprocess
import sys
from typing import Literal

Format = Literal["svg", "png", "dot"]


def draw(dot: str, fmt: Format) -> bytes:
    """Draw DOT text.

    Parameters
    ----------
    dot : str
        As `flowplan.report.tree.alignment_dot` returns it.
    fmt : {'svg', 'png', 'dot'}
        ``dot`` gives the text itself.

    Returns
    -------
    bytes
        The picture.

    Raises
    ------
    RuntimeError
        Graphviz cannot draw it; the message is what it said.
    """
    text = dot.encode()
    if fmt == "dot":
        return text
    if not sys.executable:  # an interpreter inside another program cannot start a second one
        return picture(text, fmt)
    command = [sys.executable, "-P", __file__, fmt]
    done = subprocess.run(command, input=text, capture_output=True, check=False)  # noqa: S603 - our own words
    if done.returncode:
        raise RuntimeError(done.stderr.decode(errors="replace").strip())
    return done.stdout


def picture(dot: bytes, fmt: str) -> bytes:
    """Draw DOT text in this process."""
    import pygraphviz

    with pygraphviz.AGraph(string=dot.decode()) as graph:
        return bytes(graph.draw(format=fmt, prog="dot"))


if __name__ == "__main__":
    sys.stdout.buffer.write(picture(sys.stdin.buffer.read(), sys.argv[1]))

"""Writing measured alignments into a flow's text, each with a comment that says where it comes from."""

import re
from collections.abc import Mapping
from typing import Any

from flowplan.files.reader import parse
from flowplan.files.references import write_references
from flowplan.model.base import Axis
from flowplan.model.edits import Readings
from flowplan.model.flow import Flow

#: How a comment begins that an earlier run wrote; a new one takes its place.
_MARK = "# measured: "


def write_alignments(
    text: str,
    flow: Flow,
    choices: Mapping[tuple[str, Axis], Readings],
    origins: Mapping[str, str],
    name: str = "<text>",
) -> str:
    """Return a flow file's text with measured alignments.

    Parameters
    ----------
    text : str
        The file that `flow` was read from.
    flow : Flow
        Its own plan.
    choices : mapping of (mask id, axis) to readings
        What each mask reads, with the measured alignment.
    origins : mapping of str to str
        By mask id what the comment above it says.
    name : str
        What diagnostics call the file.

    Returns
    -------
    str
        The new text, every other line and comment kept.
    """
    written = write_references(text, flow, choices, name)
    before = parse(written, name).flow
    commented = _with_comments(
        written, {i: origins[m.id] for i, m in enumerate(flow.masks) if m.id in origins}
    )
    if parse(commented, name).flow != before:
        msg = "the comments changed the flow"
        raise RuntimeError(msg)
    return commented


def _with_comments(text: str, comments: Mapping[int, str]) -> str:
    """Put a comment line above some entries of ``masks``, by their index."""
    end = "\r\n" if "\r\n" in text else "\n"
    lines = text.split(end)
    starts = _mask_lines(text)
    for index in sorted(comments, reverse=True):
        at = starts[index]
        indent = re.match(r"\s*", lines[at])
        line = (indent.group() if indent else "") + _MARK + " ".join(comments[index].split())
        if at and lines[at - 1].lstrip().startswith(_MARK):
            lines[at - 1] = line
        else:
            lines.insert(at, line)
    return end.join(lines)


def _mask_lines(text: str) -> list[int]:
    """Return the line on which each mask's entry begins, from 0."""
    from ruamel.yaml import YAML

    root: Any = YAML(typ="safe").compose(text)
    masks = next(value for key, value in root.value if key.value == "masks")
    return [int(entry.start_mark.line) for entry in masks.value]

"""Changing values in a flow file's text while every other character of it stays.

The text is cut at the places of the old values; nothing is formatted again, so comments, blank lines
and the author's own style are kept.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from flowplan.errors import Diagnostic, FlowError, Path, UsageError
from flowplan.files.yamltext import read_yaml

_ANCHOR = re.compile(r"&\S+\s+")


@dataclass(frozen=True, slots=True)
class _Cut:
    start: int
    end: int
    text: str


def replace_values(text: str, changes: Mapping[Path, str], name: str = "<text>") -> str:
    """Return YAML text with some values replaced.

    Parameters
    ----------
    text : str
        A readable YAML text.
    changes : mapping of path to str
        Paths of values that stand in the text, each with its new YAML on one line.
    name : str
        What diagnostics call the text.

    Returns
    -------
    str
        The changed text. Comments inside a replaced block follow the new value on lines of their own.

    Raises
    ------
    UsageError
        FP602, when a path does not stand in the text.
    """
    root = _marked_nodes(text, name)
    cuts = [_cut(text, root, path, new) for path, new in changes.items()]
    for cut in sorted(cuts, key=lambda c: c.start, reverse=True):
        text = text[: cut.start] + cut.text + text[cut.end :]
    return text


def _marked_nodes(text: str, name: str) -> Any:
    """Return the text's nodes with the marks of their ends, once it is known to be readable."""
    from ruamel.yaml import YAML

    _, places = read_yaml(text, name)
    if places.problems:
        raise FlowError(places.problems)
    return YAML(typ="safe").compose(text)


def _cut(text: str, root: Any, path: Path, new: str) -> _Cut:
    key, value = None, root
    for step in path:
        key, value = _descend(value, step)
        if value is None:
            place = ".".join(str(s) for s in path)
            raise UsageError([Diagnostic("FP602", f"{place} does not stand in the file", path=path)])
    if key is not None and value.start_mark.index < key.end_mark.index:
        return _alias_cut(text, key.end_mark.index, new)
    start, end = _after_anchor(text, value), _end(text, value)
    if key is not None and "\n" in text[key.end_mark.index : start]:
        # A block below its key becomes one line beside it.
        start = text.index(":", key.end_mark.index) + 1
        new = f" {new}"
    comments = _comments(text[start:end])
    if not comments:
        return _Cut(start, end, new)
    indent = " " * (key.start_mark.column if key is not None else 0)
    return _Cut(start, end, "".join([new, *(f"\n{indent}{comment}" for comment in comments)]))


def _descend(node: Any, step: str | int) -> tuple[Any, Any]:
    if node.id == "mapping":
        return next(((k, v) for k, v in node.value if k.value == step), (None, None))
    if node.id == "sequence" and isinstance(step, int) and step < len(node.value):
        return None, node.value[step]
    return None, None


def _alias_cut(text: str, after_key: int, new: str) -> _Cut:
    """Replace an alias, whose node lies elsewhere, by the new value; its anchor stays."""
    start = text.index("*", after_key)
    end = start + 1
    while end < len(text) and text[end] not in " \t\r\n,]}":
        end += 1
    return _Cut(start, end, new)


def _end(text: str, node: Any) -> int:
    """Return where a value ends; a block ends with its last leaf, not with the next token."""
    while node.id != "scalar" and node.value and not _is_flow(text, node):
        last = node.value[-1]
        node = last[1] if isinstance(last, tuple) else last
    return int(node.end_mark.index)


def _is_flow(text: str, node: Any) -> bool:
    return text[_after_anchor(text, node)] in "[{"


def _after_anchor(text: str, node: Any) -> int:
    """Return where a value itself starts; an anchor before it stays for those who refer to it."""
    start = int(node.start_mark.index)
    anchor = _ANCHOR.match(text, start)
    return anchor.end() if anchor else start


def _comments(old: str) -> list[str]:
    """Return the comments inside a replaced block."""
    found = []
    for line in old.splitlines():
        at = 0 if line.lstrip().startswith("#") else line.find(" #")
        if at >= 0 and "\n" in old:
            found.append(line[at:].strip())
    return found

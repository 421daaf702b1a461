"""YAML text to plain data with the place of every key and value."""

import re
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

from flowplan.errors import Diagnostic, FlowError, Path, Span

#: Deeper than any flow file needs; YAML nested deeper is a mistake or an attack.
MOST_DEPTH = 40
#: More nodes than this after unfolding aliases are a mistake or an attack.
MOST_NODES = 150_000
#: Stream and document count as two levels of events.
_ENVELOPE = 2

_INTEGER = re.compile(r"[-+]?[0-9]+|0o[0-7]+|0x[0-9a-fA-F]+")
_FLOAT = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_SPECIAL: dict[str, object] = {
    "": None, "~": None, "null": None, "Null": None, "NULL": None,
    "true": True, "True": True, "TRUE": True, "false": False, "False": False, "FALSE": False,
    ".nan": float("nan"), ".NaN": float("nan"), ".NAN": float("nan"),
}  # fmt: skip
_INFINITY = re.compile(r"([-+]?)\.(inf|Inf|INF)")
_LONGEST_INTEGER = 300


@dataclass(slots=True)
class Places:
    """Where keys and values stand in a text, by their path in the data."""

    file: str
    keys: dict[Path, tuple[int, int]] = field(default_factory=dict)
    values: dict[Path, tuple[int, int]] = field(default_factory=dict)

    def span(self, path: Path, *, of_key: bool = False) -> Span:
        """Return the place of the deepest part of a path that stands in the text.

        Parameters
        ----------
        path : tuple
            Keys and indices; steps that the text does not have are passed over.
        of_key : bool
            Point at the key rather than at its value.

        Returns
        -------
        Span
            Line and column from 1; the start of the file when nothing of the path is there.
        """
        known: Path = ()
        for step in path:
            if (*known, step) in self.values:
                known = (*known, step)
        table = self.keys if of_key and known in self.keys else self.values
        line, column = table.get(known, (0, 0))
        return Span(self.file, line + 1, column + 1)


def read_yaml(text: str, file: str) -> tuple[Any, Places]:
    """Read one YAML document.

    Parameters
    ----------
    text : str
        The text; YAML 1.2 core types.
    file : str
        Name used in diagnostics.

    Returns
    -------
    data : dict, list, str, int, float, bool or None
        Plain data.
    places : Places
        The place of every key and value.

    Raises
    ------
    FlowError
        For text that is not one plain YAML document, with every problem that can be named.
    """
    builder = _Builder(Places(file))
    root = compose(text, file)
    data = None if root is None else builder.value(root, (), 0)
    if builder.problems:
        raise FlowError(builder.problems)
    return data, builder.places


def compose(text: str, file: str) -> Any:
    """Return the tree of nodes of a YAML text, each with its marks; see `read_yaml`."""
    from ruamel.yaml import YAML
    from ruamel.yaml.error import MarkedYAMLError, YAMLError, YAMLStreamError

    try:
        _measure(YAML(typ="safe").parse(text), file)
        return YAML(typ="safe").compose(text)
    except MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        span = Span(file, mark.line + 1, mark.column + 1) if mark else Span(file, 1, 1)
        raise FlowError([_syntax(error, span)]) from None
    except (YAMLError, YAMLStreamError, ValueError) as error:
        raise FlowError([_unreadable(str(error), text, file)]) from None


def _measure(events: Iterable[Any], file: str) -> None:
    """Refuse what is nested too deeply or holds too much, before a recursive reader meets it."""
    depth = 0
    for number, event in enumerate(events):
        kind = type(event).__name__
        depth += kind.endswith("StartEvent") - kind.endswith("EndEvent")
        span = Span(file, event.start_mark.line + 1, event.start_mark.column + 1)
        if depth > MOST_DEPTH + _ENVELOPE:
            raise FlowError([_too_deep(span)])
        if number > MOST_NODES:
            message = f"more than {MOST_NODES} values, which no flow file needs"
            raise FlowError([Diagnostic("FP103", message, "is this the right file?", span=span)])


def _syntax(error: Any, span: Span) -> Diagnostic:
    problem = " ".join(str(error.problem or "not valid YAML").split())
    context = f" {error.context}" if error.context else ""
    if "another document" in problem:
        return Diagnostic("FP109", "a second document starts here", "one flow a file", span=span)
    if "undefined alias" in problem:
        return Diagnostic("FP104", "an alias names no anchor", "write the value out", span=span)
    hint = (
        "indent with spaces"
        if "tab" in problem or "\\t" in problem
        else "check brackets, quotes and indentation"
    )
    return Diagnostic("FP104", f"not valid YAML{context}: {problem}", hint, span=span)


def _unreadable(message: str, text: str, file: str) -> Diagnostic:
    at = next((i for i, c in enumerate(text) if not (c.isprintable() or c in "\n\r\t")), 0)
    line = text.count("\n", 0, at)
    column = at - (text.rfind("\n", 0, at) + 1)
    if at or (text and not text[0].isprintable()):
        message = f"the character U+{ord(text[at]):04X} cannot stand in YAML"
    else:
        message = "not valid YAML: " + " ".join(message.split())[:120]
    return Diagnostic("FP104", message, "is this a flow file?", span=Span(file, line + 1, column + 1))


def _too_deep(span: Span) -> Diagnostic:
    hint = f"a flow file needs fewer than {MOST_DEPTH} levels"
    return Diagnostic("FP106", "nested too deeply", hint, span=span)


@dataclass(slots=True)
class _Builder:
    """Turns composed nodes into plain data and keeps their places."""

    places: Places
    problems: list[Diagnostic] = field(default_factory=list)
    open_nodes: list[int] = field(default_factory=list)
    count: int = 0

    def value(self, node: Any, path: Path, depth: int) -> Any:
        self.count += 1
        self.places.values[path] = (node.start_mark.line, node.start_mark.column)
        if self.count > MOST_NODES or id(node) in self.open_nodes:
            self._stop("FP107", "aliases unfold to too much or to themselves", "write values out", node)
        if depth > MOST_DEPTH:
            raise FlowError([_too_deep(self._at(node))])
        if node.id == "scalar":
            return self._scalar(node)
        self.open_nodes.append(id(node))
        if node.id == "sequence":
            result: Any = [self.value(n, (*path, i), depth + 1) for i, n in enumerate(node.value)]
        else:
            result = self._mapping(node, path, depth)
        self.open_nodes.pop()
        return result

    def _mapping(self, node: Any, path: Path, depth: int) -> dict[str, Any]:
        result: dict[str, Any] = {}
        for key_node, value_node in node.value:
            if key_node.id != "scalar":
                self._note("FP109", "a key must be a plain text", "write `key: value`", key_node)
                continue
            key = str(key_node.value)
            if key == "<<" and not key_node.style:
                self._note("FP109", "merge keys are not used in a flow file", "write the keys out", key_node)
                continue
            if key in result:
                self._note("FP105", f"the key {key!r} stands twice", "keep one of them", key_node)
                continue
            self.places.keys[(*path, key)] = (key_node.start_mark.line, key_node.start_mark.column)
            result[key] = self.value(value_node, (*path, key), depth + 1)
        return result

    def _scalar(self, node: Any) -> object:
        if node.style in ("'", '"', "|", ">"):
            return node.value
        tag = _tag(node)
        if tag is not None:
            self._note("FP109", f"the tag {tag} is not used in a flow file", "leave the tag out", node)
        return plain_scalar(node.value)

    def _at(self, node: Any) -> Span:
        return Span(self.places.file, node.start_mark.line + 1, node.start_mark.column + 1)

    def _note(self, code: str, message: str, hint: str, node: Any) -> None:
        self.problems.append(Diagnostic(code, message, hint, span=self._at(node)))

    def _stop(self, code: str, message: str, hint: str, node: Any) -> None:
        raise FlowError([Diagnostic(code, message, hint, span=self._at(node))])


def _tag(node: Any) -> str | None:
    """Return a tag that the author wrote, None for the standard ones."""
    tag = str(getattr(node, "tag", "") or "")
    return tag if tag.startswith("!") and tag != "!" else None


def plain_scalar(text: str) -> object:
    """Resolve an unquoted scalar by the YAML 1.2 core schema, so that ``no`` and ``on`` stay text."""
    if text in _SPECIAL:
        return _SPECIAL[text]
    if _INTEGER.fullmatch(text) and len(text) < _LONGEST_INTEGER:
        return int(text, 0) if text[:2] in ("0o", "0x") else int(text)
    if _FLOAT.fullmatch(text):
        return float(text)
    infinite = _INFINITY.fullmatch(text)
    if infinite:
        return float(infinite.group(1) + "inf")
    return text

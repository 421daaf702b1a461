"""YAML text to plain data with the place of every key and value."""

import re
from dataclasses import dataclass, field
from typing import Any, NoReturn

from flowplan.errors import Diagnostic, FlowError, Path, Span, in_brief
from flowplan.files.nodes import MOST_DEPTH, MOST_NODES, Node, compose
from flowplan.files.syntax import syntax_diagnostic, unreadable_diagnostic

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
    """Where keys and values stand in a text, by their path in the data; what is wrong with the text."""

    file: str
    keys: dict[Path, tuple[int, int]] = field(default_factory=dict)
    values: dict[Path, tuple[int, int]] = field(default_factory=dict)
    problems: list[Diagnostic] = field(default_factory=list)

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
        The place of every key and value, and the problems that leave the rest readable: keys that
        stand twice, of which the first counts, and tags, which are passed over.

    Raises
    ------
    FlowError
        For text that is not one plain YAML document, with every problem that can be named.
    """
    builder = _Builder(Places(file))
    root = _compose(text, file)
    data = None if root is None else builder.value(root, (), 0)
    if builder.is_incomplete:
        raise FlowError(builder.places.problems)
    return data, builder.places


def _compose(text: str, file: str) -> Node | None:
    from ruamel.yaml import YAML
    from ruamel.yaml.error import MarkedYAMLError, YAMLError, YAMLStreamError

    try:
        return compose(YAML(typ="safe").parse(text), file)
    except MarkedYAMLError as error:
        raise FlowError([syntax_diagnostic(error, text, file)]) from None
    except (YAMLError, YAMLStreamError, ValueError) as error:
        raise FlowError([unreadable_diagnostic(str(error), text, file)]) from None


@dataclass(slots=True)
class _Builder:
    """Turns composed nodes into plain data and keeps their places."""

    places: Places
    is_incomplete: bool = False
    open_nodes: set[int] = field(default_factory=set)
    count: int = 0

    def value(self, node: Node, path: Path, depth: int) -> Any:
        self.count += 1
        self.places.values[path] = (node.line, node.column)
        if self.count > MOST_NODES or id(node) in self.open_nodes:
            self._stop("FP107", "aliases unfold to too much or to themselves", "write values out", node)
        if depth > MOST_DEPTH:
            self._stop("FP106", "nested too deeply", "aliases make it so; write values out", node)
        if node.tag is not None:
            tag = node.tag.replace("tag:yaml.org,2002:", "!!")
            self._note("FP109", f"the tag {tag} is not used in a flow file", "leave the tag out", node)
        if node.kind == "scalar":
            return node.value if node.quoted else plain_scalar(node.value)
        self.open_nodes.add(id(node))
        if node.kind == "sequence":
            result: Any = [self.value(n, (*path, i), depth + 1) for i, n in enumerate(node.value)]
        else:
            result = self._mapping(node, path, depth)
        self.open_nodes.discard(id(node))
        return result

    def _mapping(self, node: Node, path: Path, depth: int) -> dict[str, Any]:
        result: dict[str, Any] = {}
        for key_node, value_node in zip(node.value[::2], node.value[1::2], strict=True):
            if key_node.kind != "scalar":
                self._note("FP109", "a key must be a plain text", "write `key: value`", key_node)
                self.is_incomplete = True
                continue
            key = key_node.value
            if key == "<<" and not key_node.quoted:
                self._note("FP109", "merge keys are not used in a flow file", "write the keys out", key_node)
                self.is_incomplete = True
                continue
            place = (*path, key)
            if key in result:
                line = self.places.keys[place][0] + 1
                hint = f"keep one of them; the first is in line {line}"
                self._note("FP105", f"the key {key!r} stands twice", hint, key_node)
                continue
            self.places.keys[place] = (key_node.line, key_node.column)
            result[key] = self.value(value_node, place, depth + 1)
        return result

    def _note(self, code: str, message: str, hint: str, node: Node) -> None:
        finding = Diagnostic(code, message, hint, span=node.span(self.places.file))
        self.places.problems.append(in_brief(finding))

    def _stop(self, code: str, message: str, hint: str, node: Node) -> NoReturn:
        raise FlowError([Diagnostic(code, message, hint, span=node.span(self.places.file))])


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

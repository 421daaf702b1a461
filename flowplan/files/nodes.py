"""From YAML events to a light tree of nodes, within bounds that hold before anything recurses."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, Literal, NoReturn

from flowplan.errors import Diagnostic, FlowError, Span

#: Deeper than any flow file needs; YAML nested deeper is a mistake or an attack.
MOST_DEPTH = 40
#: More nodes than this, aliases unfolded, are a mistake or an attack.
MOST_NODES = 150_000


@dataclass(slots=True, eq=False)
class Node:
    """One scalar, sequence or mapping of the text.

    Attributes
    ----------
    kind : {'scalar', 'sequence', 'mapping'}
        What it is.
    value : str or list of Node
        The text of a scalar; the entries of a sequence; keys and values of a mapping in turn.
    line, column : int
        Counted from 0.
    quoted : bool
        Whether a scalar is quoted or a block, and so a text whatever it looks like.
    tag : str or None
        A tag that the author wrote.
    """

    kind: Literal["scalar", "sequence", "mapping"]
    value: Any
    line: int
    column: int
    quoted: bool = False
    tag: str | None = None

    def span(self, file: str) -> Span:
        """Return the node's place."""
        return Span(file, self.line + 1, self.column + 1)


def compose(events: Iterable[Any], file: str) -> Node | None:
    """Build the tree of one YAML document.

    Parameters
    ----------
    events : iterable
        Events of a YAML parser.
    file : str
        Name used in diagnostics.

    Returns
    -------
    Node or None
        The root; None for a text without content.

    Raises
    ------
    FlowError
        FP103 for more nodes than a flow can hold, FP104 for an alias without its anchor, FP106 for
        deep nesting, FP109 for a second document.
    """
    composer = _Composer(file)
    for event in events:
        composer.take(event)
    return composer.root


class _Composer:
    def __init__(self, file: str) -> None:
        self.file = file
        self.root: Node | None = None
        self.open: list[Node] = []
        self.anchors: dict[str, Node] = {}
        self.count = 0
        self.documents = 0

    def take(self, event: Any) -> None:
        kind = type(event).__name__
        if kind == "ScalarEvent":
            quoted = event.style in ("'", '"', "|", ">")
            self._add(event, self._node(event, "scalar", event.value, quoted=quoted))
        elif kind == "MappingStartEvent":
            self._begin(event, self._node(event, "mapping", []))
        elif kind == "SequenceStartEvent":
            self._begin(event, self._node(event, "sequence", []))
        elif kind in ("MappingEndEvent", "SequenceEndEvent"):
            self.open.pop()
        elif kind == "AliasEvent":
            if event.anchor not in self.anchors:
                self._stop(
                    event, "FP104", f"the alias *{event.anchor} names no anchor", "write the value out"
                )
            self._hang(self.anchors[event.anchor])
        elif kind == "DocumentStartEvent":
            self.documents += 1
            if self.documents > 1:
                self._stop(event, "FP109", "a second document starts here", "one flow a file")

    def _node(self, event: Any, kind: Any, value: Any, *, quoted: bool = False) -> Node:
        self.count += 1
        if self.count > MOST_NODES:
            message = f"more than {MOST_NODES} values, which no flow file needs"
            self._stop(event, "FP103", message, "is this the right file?")
        mark, tag = event.start_mark, event.tag
        return Node(kind, value, mark.line, mark.column, quoted, None if tag == "!" else tag)

    def _begin(self, event: Any, node: Node) -> None:
        self._add(event, node)
        self.open.append(node)
        if len(self.open) > MOST_DEPTH:
            hint = f"a flow file needs fewer than {MOST_DEPTH} levels"
            self._stop(event, "FP106", "nested too deeply", hint)

    def _add(self, event: Any, node: Node) -> None:
        if event.anchor is not None:
            self.anchors[event.anchor] = node
        self._hang(node)

    def _hang(self, node: Node) -> None:
        if self.open:
            self.open[-1].value.append(node)
        else:
            self.root = node

    def _stop(self, event: Any, code: str, message: str, hint: str) -> NoReturn:
        span = Span(self.file, event.start_mark.line + 1, event.start_mark.column + 1)
        raise FlowError([Diagnostic(code, message, hint, span=span)])

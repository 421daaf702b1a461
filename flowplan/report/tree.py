"""The alignment tree as DOT text."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from flowplan.engine.graph import AlignmentGraph
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow, Layer
from flowplan.model.masks import Mask, SelfAligned

if TYPE_CHECKING:
    import graphviz

EdgeKind = Literal["both", "x", "y", "follow"]

#: One line style for each kind of edge; colour only supports it.
_EDGE_STYLE: dict[EdgeKind, dict[str, str]] = {
    "both": {"style": "solid", "color": "#26414f", "penwidth": "1.4"},
    "x": {"style": "dashed", "color": "#0b6a8f", "penwidth": "1.6"},
    "y": {"style": "dotted", "color": "#9a4a00", "penwidth": "2.4"},
    "follow": {"style": "solid", "color": "#5a5a5a", "penwidth": "1", "arrowhead": "odot"},
}
_FONT = "Helvetica"
#: Longer titles are cut in the drawing; the whole title stands in the mask table.
_LONGEST = 34


@dataclass(frozen=True, slots=True)
class Edge:
    """One reading in the drawing.

    Attributes
    ----------
    reference, layer : int
        Places in the drawing; 0 is the wafer, layers follow in process order from 1.
    kind : {'both', 'x', 'y', 'follow'}
        Both axes or one, or a self-aligned feature's parent.
    label : str
        What stands beside the line; may be empty.
    """

    reference: int
    layer: int
    kind: EdgeKind
    label: str


def edges_of(flow: Flow, graph: AlignmentGraph) -> tuple[Edge, ...]:
    """Return every reading once, x and y together where they agree.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    graph : AlignmentGraph
        Its alignment graph.

    Returns
    -------
    tuple of Edge
        In process order of the reading layer, then in the order of the file.
    """
    place = {WAFER: 0} | {name: i + 1 for i, name in enumerate(flow.layers)}
    found: list[Edge] = []
    for name, layer in flow.layers.items():
        weights = {axis: dict(graph.references(name, axis=axis)) for axis in AXES}
        for reference in dict.fromkeys((*weights["x"], *weights["y"])):
            for kind, weight in _kinds(weights, reference):
                label = "" if weight == 1 else f"{weight:.0%}".replace("%", " %")
                if isinstance(layer, SelfAligned):
                    label = "follows" if kind == "both" else f"follows in {kind}"
                    kind = "follow"
                found.append(Edge(place[reference], place[name], kind, label))
    return tuple(found)


def _kinds(weights: dict[Axis, dict[str, float]], reference: str) -> Iterator[tuple[EdgeKind, float]]:
    on_x, on_y = (weights[axis].get(reference) for axis in AXES)
    if on_x is not None and on_x == on_y:
        yield "both", on_x
        return
    if on_x is not None:
        yield "x", on_x
    if on_y is not None:
        yield "y", on_y


def alignment_dot(flow: Flow, graph: AlignmentGraph | None = None, *, links: bool = False) -> str:
    """Return the alignment tree as DOT text, one layer a row in process order.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    graph : AlignmentGraph, optional
        Its alignment graph, when it is at hand.
    links : bool
        Whether every layer links to ``#m1``, ``#m2``, ..., the rows of the report's mask table.

    Returns
    -------
    str
        Nodes are named by their place, so that no text of the flow acts as DOT.
    """
    import graphviz

    graph = graph or AlignmentGraph(flow)
    dot = graphviz.Digraph("alignment")
    dot.attr("graph", rankdir="TB", ranksep="0.28", nodesep="0.3", bgcolor="transparent")
    dot.attr("graph", fontname=_FONT, outputorder="edgesfirst", splines="true", newrank="true")
    dot.attr("node", fontname=_FONT, fontsize="11", shape="box", margin="0.12,0.05", height="0.36")
    dot.attr("node", color="#26414f", fontcolor="#10242e", style="filled", fillcolor="#fbfaf5")
    dot.attr("edge", fontname=_FONT, fontsize="9", fontcolor="#3c4a50", arrowsize="0.6", dir="back")
    _rows(dot, flow, graph, links=links)
    for edge in edges_of(flow, graph):
        style = _EDGE_STYLE[edge.kind] | {"class": f"e-{edge.kind}"}
        if style.pop("arrowhead", None):
            style["arrowtail"] = "odot"
        label = _text(edge.label) if edge.label else None
        dot.edge(f"n{edge.reference}", f"n{edge.layer}", label=label, tooltip=" ", **style)
    return str(dot.source)


def _rows(dot: "graphviz.Digraph", flow: Flow, graph: AlignmentGraph, *, links: bool) -> None:
    """Add the layers and, at the left, a spine of step numbers that holds them in process order."""
    dot.node("s0", label="", shape="plaintext", style="", tooltip=" ")
    dot.node("n0", label="wafer", shape="ellipse", tooltip=" ", **{"class": "wafer"})
    step = 0
    for i, (name, layer) in enumerate(flow.layers.items(), start=1):
        step += isinstance(layer, Mask)
        number = str(step) if isinstance(layer, Mask) else " "
        link = {"URL": f"#m{i}"} if links else {}
        with dot.subgraph(graph_attr={"rank": "same"}) as row:
            row.node(f"s{i}", label=number, shape="plaintext", style="", tooltip=" ", **{"class": "step"})
            row.node(f"n{i}", **_node(name, layer, graph), **link)
        dot.edge(f"s{i - 1}", f"s{i}", style="invis", weight="20")
    with dot.subgraph(graph_attr={"rank": "same"}) as row:
        row.node("s0")
        row.node("n0")


def _node(name: str, layer: Layer, graph: AlignmentGraph) -> dict[str, str]:
    """Return what tells a layer apart: outline and words, not colour alone."""
    look = {"class": "mask"}
    words = [name]
    if layer.title and layer.title != name:
        words.append(layer.title)
    if isinstance(layer, SelfAligned):
        words.append("self-aligned")
        look = {"class": "selfaligned", "style": "rounded,filled", "peripheries": "2"}
    elif layer.side == "back":
        words.append("back side")
        look = {"class": "back", "shape": "note"}
    if any(graph.is_averaged(name, axis=axis) for axis in AXES):
        words.append("averaged references")
        look["class"] += " averaged"
        look["penwidth"] = "2.4"
    tooltip = " - ".join(words)
    return {**look, "label": _lines(words), "tooltip": _text(tooltip)}


def _lines(words: list[str]) -> str:
    """Return words below each other; the only escape sequences are the line breaks."""
    import graphviz

    label: str = graphviz.nohtml("\\n".join(_text(cut(word)) for word in words))
    return label


def cut(text: str, longest: int = _LONGEST) -> str:
    """Return the text on one line, cut with an ellipsis where it is longer than `longest`."""
    flat = " ".join("".join(c if c.isprintable() else " " for c in text).split())
    return flat if len(flat) <= longest else flat[: longest - 1] + "…"


def _text(text: str) -> str:
    """Return text that DOT shows as it is: no escape sequence, no entity, no markup."""
    import graphviz

    shown: str = graphviz.escape(cut(text, 200).replace("&", "&amp;"))
    return shown

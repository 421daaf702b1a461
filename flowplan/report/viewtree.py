"""The alignment tree as the report shows it: the drawing, and the same in words."""

import re
from collections.abc import Sequence
from dataclasses import dataclass

from flowplan.report.tree import alignment_dot, draw
from flowplan.report.viewbase import Base, counted

_COMMENT = re.compile(r"<!--.*?-->\s*", re.DOTALL)
_SIZE = re.compile(r'<svg width="(\d+)pt" height="(\d+)pt"')


@dataclass(frozen=True, slots=True)
class TreeView:
    """The drawing.

    Attributes
    ----------
    svg : str
        Markup that Graphviz wrote; it escapes the text of labels itself.
    summary : str
        What the drawing shows, in a sentence.
    """

    svg: str
    summary: str


def tree_view(base: Base) -> TreeView:
    """Return the alignment tree of a result."""
    flow = base.result.flow
    dot = alignment_dot(flow, base.result.engine.graph, links=True)
    layers = counted(len(flow.masks), "mask")
    if flow.self_aligned:
        layers += f" and {counted(len(flow.self_aligned), 'self-aligned feature')}"
    summary = f"Alignment tree of {layers}, in process order from top to bottom"
    return TreeView(inline_svg(draw(dot, "svg").decode(), summary), summary)


def inline_svg(svg: str, title: str, classes: Sequence[str] = ("tree",)) -> str:
    """Return Graphviz's SVG ready to stand inside a page: no prolog, no comments, a name.

    Parameters
    ----------
    svg : str
        A whole SVG document.
    title : str
        Trusted text that names the drawing.
    classes : sequence of str
        For the style sheet.
    """
    body = _COMMENT.sub("", svg[svg.index("<svg") :])
    named = rf'<svg class="{" ".join(classes)}" role="group" aria-label="{title}" width="\1" height="\2"'
    return _SIZE.sub(named, body, count=1)

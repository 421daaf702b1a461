"""The alignment tree as the report shows it: the drawing, and the same in words."""

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from flowplan.model.base import AXES
from flowplan.report.layout import draw
from flowplan.report.tree import alignment_dot, edges_of
from flowplan.report.viewbase import Base, counted

_COMMENT = re.compile(r"<!--.*?-->\s*|<title>.*?</title>\s*", re.DOTALL)
_SHIFT = re.compile(r"translate\(\S+ (\S+)\)")
_NODE = re.compile(r'class="node (?!step).*?</g>', re.DOTALL)
_TEXT = re.compile(r'<text [^>]*? y="(\S+?)"')
#: A printed page holds so much of a drawing [px]; what is wider is shrunk to it.
_PAGE_WIDTH, _PAGE_HEIGHT = 695, 810
#: A drawing that must not shrink further than this stands whole on one page.
_SMALLEST = 0.7
#: How far a box reaches above and below its lines of text [px].
_ABOVE, _BELOW = 18, 12
_SIZE = re.compile(r'<svg width="(\d+)pt" height="(\d+)pt"')


@dataclass(frozen=True, slots=True)
class PageSlice:
    """A part of the drawing from `top` down, over its whole width [px]."""

    top: int
    width: int
    height: int


@dataclass(frozen=True, slots=True)
class TreeView:
    """The drawing.

    Attributes
    ----------
    svg : str
        Markup that Graphviz wrote; it escapes the text of labels itself.
    summary : str
        What the drawing shows, in a sentence.
    marks : frozenset of str
        What occurs in the drawing and needs a line in its legend: kinds of edge, ``selfaligned``,
        ``averaged``, ``back``.
    slices : tuple of PageSlice
        A tall drawing page by page, cut between rows; empty for one page.
    """

    svg: str
    summary: str
    marks: frozenset[str]
    slices: tuple[PageSlice, ...]


def tree_view(base: Base) -> TreeView:
    """Return the alignment tree of a result."""
    flow = base.result.flow
    dot = alignment_dot(flow, base.result.engine.graph, links=True)
    layers = counted(len(flow.masks), "mask")
    if flow.self_aligned:
        layers += f" and {counted(len(flow.self_aligned), 'self-aligned feature')}"
    summary = f"Alignment tree of {layers}, in process order from top to bottom"
    svg = draw(dot, "svg").decode()
    return TreeView(inline_svg(svg, summary), summary, _marks(base), page_slices(svg))


def _marks(base: Base) -> frozenset[str]:
    flow, graph = base.result.flow, base.result.engine.graph
    found: set[str] = {edge.kind for edge in edges_of(flow, graph)}
    if flow.self_aligned:
        found.add("selfaligned")
    if any(graph.is_averaged(name, axis=axis) for name in flow.layers for axis in AXES):
        found.add("averaged")
    if any(mask.side == "back" for mask in flow.masks):
        found.add("back")
    return frozenset(found)


def page_slices(svg: str) -> tuple[PageSlice, ...]:
    """Return the parts that cut a tall drawing into pages of about one height, never through a layer.

    Parameters
    ----------
    svg : str
        Graphviz's drawing of the tree, its y axis shifted so that the drawing's foot is 0.
    """
    size, shift = _SIZE.search(svg), _SHIFT.search(svg)
    if size is None or shift is None or int(size[2]) <= _PAGE_HEIGHT / _SMALLEST:
        return ()
    width, height = int(size[1]), int(size[2])
    page = _PAGE_HEIGHT * max(1.0, width / _PAGE_WIDTH)
    gaps = _gaps(sorted({_row_of(node, float(shift[1])) for node in _NODE.findall(svg)}))
    n = math.ceil(height / page)
    wanted = (height * i / n for i in range(1, n))
    cuts = {min(gaps, key=lambda gap: abs(gap - want)) for want in wanted} if gaps else set()
    return tuple(PageSlice(round(a), width, round(b - a)) for a, b in pairwise([0, *sorted(cuts), height]))


def _gaps(rows: Sequence[tuple[float, float]]) -> list[float]:
    """Return the middles of the gaps between rows of boxes [px]."""
    found, foot = [], rows[0][1] if rows else 0.0
    for top, bottom in rows:
        if top > foot:
            found.append((foot + top) / 2)
        foot = max(foot, bottom)
    return found


def _row_of(node: str, shift: float) -> tuple[float, float]:
    """Return the top and bottom of a layer's box, from its lines of text [px]."""
    lines = [float(y) + shift for y in _TEXT.findall(node)]
    return min(lines) - _ABOVE, max(lines) + _BELOW


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

"""The alignment tree as the report shows it: the drawing, and the same in words."""

import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from flowplan.report.tree import alignment_dot, draw
from flowplan.report.viewbase import Base, counted

_COMMENT = re.compile(r"<!--.*?-->\s*|<title>.*?</title>\s*", re.DOTALL)
_SHIFT = re.compile(r"translate\(\S+ (\S+)\)")
_NODE = re.compile(r'class="node (?!step).*?</g>', re.DOTALL)
_TEXT = re.compile(r'<text [^>]*? y="(\S+?)"')
#: What fits on a printed page [pt], and how far a box reaches above and below its lines of text.
_PAGE, _ABOVE, _BELOW = 700, 18, 12
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
    slices : tuple of str
        View boxes that show a tall drawing page by page, cut between rows; empty for one page.
    """

    svg: str
    summary: str
    slices: tuple[str, ...]


def tree_view(base: Base) -> TreeView:
    """Return the alignment tree of a result."""
    flow = base.result.flow
    dot = alignment_dot(flow, base.result.engine.graph, links=True)
    layers = counted(len(flow.masks), "mask")
    if flow.self_aligned:
        layers += f" and {counted(len(flow.self_aligned), 'self-aligned feature')}"
    summary = f"Alignment tree of {layers}, in process order from top to bottom"
    svg = draw(dot, "svg").decode()
    return TreeView(inline_svg(svg, summary), summary, page_slices(svg))


def page_slices(svg: str) -> tuple[str, ...]:
    """Return view boxes that cut a tall drawing into pages, never through a layer.

    Parameters
    ----------
    svg : str
        Graphviz's drawing of the tree, its y axis shifted so that the drawing's foot is 0.
    """
    size, shift = _SIZE.search(svg), _SHIFT.search(svg)
    if size is None or shift is None or int(size[2]) <= _PAGE:
        return ()
    width, height = int(size[1]), int(size[2])
    rows = sorted({_row_of(node, float(shift[1])) for node in _NODE.findall(svg)})
    cuts, foot = [0.0], 0.0
    for top, bottom in rows:
        if bottom > cuts[-1] + _PAGE and foot > cuts[-1]:
            cuts.append((foot + top) / 2)
        foot = max(foot, bottom)
    return tuple(f"0 {a:.4g} {width} {b - a:.4g}" for a, b in pairwise([*cuts, float(height)]))


def _row_of(node: str, shift: float) -> tuple[float, float]:
    """Return the top and bottom of a layer's box, from its lines of text [pt]."""
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

"""The alignment tree as lines of text.

The longest line of descent stays in one column and only what branches off it is indented, so that
a flow of many masks still fits on a screen.
"""

from collections.abc import Iterator
from dataclasses import dataclass

from flowplan.engine.graph import AlignmentGraph
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.masks import Mask, SelfAligned

_BRANCH, _LAST, _PAST, _UNDER = "├─ ", "└─ ", "│  ", "   "


@dataclass(frozen=True, slots=True)
class TreeLine:
    """One layer in the tree.

    Attributes
    ----------
    number : int or None
        The mask's place in process order from 1; None for a self-aligned feature and the wafer.
    branch : str
        The lines of the drawing before the name.
    name : str
        The layer.
    reads : str
        Its references in words: per axis where they differ, with shares where they are averaged.
    """

    number: int | None
    branch: str
    name: str
    reads: str


def tree_lines(flow: Flow, axes: tuple[Axis, ...] = AXES) -> tuple[TreeLine, ...]:
    """Return the alignment tree line by line.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    axes : tuple of {'x', 'y'}
        Axes whose references are named. Each layer stands under its reference on the first of them,
        the heaviest where it is averaged.

    Returns
    -------
    tuple of TreeLine
        Each layer once, under the wafer.
    """
    tree = _Tree(flow, axes)
    return tuple(TreeLine(tree.number(name), branch, name, tree.reads(name)) for branch, name in tree.walk())


class _Tree:
    def __init__(self, flow: Flow, axes: tuple[Axis, ...]) -> None:
        self.flow = flow
        self.axes = axes
        self.graph = AlignmentGraph(flow)
        self.numbers = {mask.id: i + 1 for i, mask in enumerate(flow.masks)}
        self.children: dict[str, list[str]] = {name: [] for name in (WAFER, *flow.layers)}
        for name in flow.layers:
            references = self.graph.references(name, axis=axes[0])
            self.children[max(references, key=lambda r: r[1])[0]].append(name)
        self.size = dict.fromkeys(self.children, 1)
        for name in reversed(list(self.children)):
            self.size[name] += sum(self.size[child] for child in self.children[name])

    def number(self, name: str) -> int | None:
        return self.numbers.get(name)

    def walk(self) -> Iterator[tuple[str, str]]:
        return self._descent(WAFER, "", "")

    def _descent(self, name: str, first: str, rest: str) -> Iterator[tuple[str, str]]:
        """Yield a layer and all that derives from it; branches first, then on down the stem."""
        prefix = first
        stem: str | None = name
        while stem is not None:
            yield prefix, stem
            prefix, branches, stem = rest, *self._divide(stem)
            for branch in branches:
                ends = stem is None and branch == branches[-1]
                yield from self._descent(
                    branch, rest + (_LAST if ends else _BRANCH), rest + (_UNDER if ends else _PAST)
                )

    def _divide(self, name: str) -> tuple[list[str], str | None]:
        """Return the children that branch off, and the one with most descendants, if any has some."""
        children = self.children[name]
        stem = max(reversed(children), key=self.size.__getitem__, default=None)
        if stem is not None and self.size[stem] == 1 and len(children) > 1:
            stem = None
        return [child for child in children if child != stem], stem

    def reads(self, name: str) -> str:
        if name == WAFER:
            return ""
        by_axis = {axis: self._references(name, axis) for axis in self.axes}
        if len(set(by_axis.values())) == 1:
            text = by_axis[self.axes[0]]
        else:
            mark = "; " if any("," in words for words in by_axis.values()) else ", "
            text = mark.join(f"{axis}: {words}" for axis, words in by_axis.items())
        layer = self.flow.layers[name]
        if isinstance(layer, SelfAligned):
            return f"{text} (self-aligned)"
        return f"{text} (back side)" if isinstance(layer, Mask) and layer.side == "back" else text

    def _references(self, name: str, axis: Axis) -> str:
        references = self.graph.references(name, axis=axis)
        if len(references) == 1:
            return references[0][0]
        return ", ".join(f"{reference} {100 * weight:.3g} %" for reference, weight in references)

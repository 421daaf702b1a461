"""Geometry of the report's charts; the templates put it into SVG, so that text is escaped there."""

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from flowplan.engine.graph import Chain
from flowplan.report.tree import cut

_BOX_W, _BOX_H, _STEP = 148, 30, 66
_LEFT, _MIDDLE, _RIGHT = 100, 220, 340
#: A chain of one branch needs room for its boxes and for a label beside the line.
_WIDTH, _SINGLE = 440, 190
#: A box holds so many characters of an id.
_FITS = 17
#: A bar that runs past its end is cut at this share of its length.
_MOST = 1.3
#: Steps of a bar that is as long as the whole.
BAR_STEPS = 30


@dataclass(frozen=True, slots=True)
class Box:
    """A layer in the drawing of a chain; x, y is its centre."""

    x: int
    y: int
    text: str
    full: str
    kind: str


@dataclass(frozen=True, slots=True)
class Line:
    """A hop, from the child up to its reference, with its label's place."""

    x1: int
    y1: int
    x2: int
    y2: int
    label: str
    label_x: int
    label_y: int
    anchor: str


@dataclass(frozen=True, slots=True)
class ChainDrawing:
    """A chain as boxes and lines; the common reference stands at the top, `left` is the first x."""

    left: int
    width: int
    height: int
    box_width: int
    box_height: int
    boxes: tuple[Box, ...]
    lines: tuple[Line, ...]


def chain_drawing(chain: Chain, labels: Sequence[str]) -> ChainDrawing:
    """Return the geometry of a chain.

    Parameters
    ----------
    chain : Chain
        The chain.
    labels : sequence of str
        One a hop, in the order of `Chain.hops`.

    Returns
    -------
    ChainDrawing
        The first layer's branch at the left, the second's at the right.
    """
    turn = chain.layers.index(chain.through)
    up, down = chain.layers[:turn], chain.layers[turn + 1 :]
    top = _BOX_H // 2 + 6
    single = not up or not down
    places = {chain.through: (_MIDDLE, top)}
    for branch, x in ((up[::-1], _LEFT), (down, _RIGHT)):
        for level, layer in enumerate(branch, start=1):
            places[layer] = (_MIDDLE if single else x, top + level * _STEP)
    ends = {chain.layers[0]: "end", chain.layers[-1]: "end"}
    boxes = [
        Box(x, y, cut(layer, _FITS), layer, "through" if layer == chain.through else ends.get(layer, "mid"))
        for layer, (x, y) in places.items()
    ]
    lines = [
        _line(places[child], places[ref], label)
        for (child, ref), label in zip(chain.hops(), labels, strict=True)
    ]
    height = max(y for _, y in places.values()) + _BOX_H // 2 + 6
    left, width = (_MIDDLE - _BOX_W // 2 - 2, _SINGLE) if single else (0, _WIDTH)
    return ChainDrawing(left, width, height, _BOX_W, _BOX_H, tuple(boxes), tuple(lines))


def _line(child: tuple[int, int], reference: tuple[int, int], label: str) -> Line:
    x1, y1 = child[0], child[1] - _BOX_H // 2
    x2, y2 = reference[0], reference[1] + _BOX_H // 2
    x2 += (x1 > x2) * 40 - (x1 < x2) * 40
    right = x1 >= _MIDDLE
    middle_x, middle_y = (x1 + x2) // 2, (y1 + y2) // 2
    return Line(
        x1, y1, x2, y2, label, middle_x + (10 if right else -10), middle_y + 4, "start" if right else "end"
    )


def bar(share: float) -> int:
    """Return the length of a bar in steps of 1/`BAR_STEPS` of the whole.

    Parameters
    ----------
    share : float
        Share of the whole; a bar that runs far past the whole is cut at 1.3 times of it.

    Returns
    -------
    int
        The style sheet has a class for each length. What is not 0 has at least one step.
    """
    if share == 0:
        return 0
    return max(1, round(min(share, _MOST) * BAR_STEPS))


@dataclass(frozen=True, slots=True)
class Squares:
    """The fields of one class on a wafer map: `path` draws a square at each grid place."""

    level: int
    path: str


def squares(places: Sequence[tuple[int, int]], levels: Sequence[int]) -> tuple[Squares, ...]:
    """Return fields grouped by class, neighbours joined into runs along rows or along columns.

    Parameters
    ----------
    places : sequence of (int, int)
        Column, and row counted downwards, of each field.
    levels : sequence of int
        The class of each field.

    Returns
    -------
    tuple of Squares
        By class. A run of n fields is a line of length n - 1 that a dash pattern of pitch 1 cuts
        into n squares, so a map costs a few bytes a run.
    """
    return tuple(
        Squares(level, runs([place for place, own in zip(places, levels, strict=True) if own == level]))
        for level in sorted(set(levels))
    )


def runs(places: Sequence[tuple[int, int]]) -> str:
    """Return the shorter of two paths over grid places: along their rows or along their columns."""
    along_rows = "".join(f"M{_xy(c, r)}h{n}" for r, c, n in _runs((row, column) for column, row in places))
    along_columns = "".join(f"M{_xy(c, r)}v{n}" for c, r, n in _runs(places))
    return min(along_rows, along_columns, key=len)


def _runs(places: Iterable[tuple[int, int]]) -> Iterator[tuple[int, int, str]]:
    """Yield (line, start, length) of every unbroken run of (line, position)."""
    start: tuple[int, int] | None = None
    length = 0
    for line, position in sorted(places):
        if start is not None and (line, position) == (start[0], start[1] + length):
            length += 1
            continue
        if start is not None:
            yield (*start, _beyond(length))
        start, length = (line, position), 1
    if start is not None:
        yield (*start, _beyond(length))


def _beyond(length: int) -> str:
    """Return a line's length a little past its last square, so that no renderer drops that one."""
    return f"{length - 1 or ''}.1"


def _xy(column: int, row: int) -> str:
    return f"{column}{row}" if row < 0 else f"{column} {row}"

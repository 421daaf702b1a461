"""Where every layer lies: the one mechanism from which overlays follow.

=======  ===========================  =========================================================
symbol   name                         meaning
=======  ===========================  =========================================================
F        printed frame                where a mask was printed, over its references r:
                                      F_i = sum_r w_r (F_r + M_r + A_ir) + L_i
D        device pattern               D_i = F_i + P_i
M        marks                        what moves the marks as later masks read them
A        alignment                    reading r's marks from mask i, fresh for each (i, r, axis)
L, P     own terms                    of the mask and its tool, entering layer and pattern
E        edge errors                  outward positive; half of the CD, or the edge itself
=======  ===========================  =========================================================

A self-aligned feature takes over F, P and M of what it follows, so its D is its parent's exactly.
"""

import math
from collections import defaultdict
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from flowplan.engine.marksites import mirrored, scalars
from flowplan.engine.sources import (
    FloatArray,
    IntArray,
    ModeTable,
    Source,
    SourceBook,
    action,
    basis_over,
    deviation,
)
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Mask, Reading, SelfAligned
from flowplan.model.paths import PER_MARK, Keys, layer_keys, reading_axes, reading_keys, term_keys
from flowplan.model.terms import SHAPE_PER_AXIS, Kind, Level, Shape, Size, SizeParts, Term, quoted
from flowplan.model.varies import edge_level, reading_level, term_level

Amounts = list[tuple[int, float]]
PartName = str
#: Differences this small against their terms are dust of averaged weights, not errors.
_DUST = 1e-12


@dataclass(frozen=True, slots=True)
class Placement:
    """Every layer's pattern and edges as amounts over modes.

    Attributes
    ----------
    index : dict of str to int
        Row of each layer; the wafer has a row of zeros.
    sources : tuple of Source
        Every independent scalar.
    keys : tuple of hashable
        What tells each source from the others; (key, (place, kind, axis)) when placed apart.
    modes : dict of axis to ModeTable
        What each column means.
    pattern, edge, marks : dict of axis to ndarray, shape (n_layers + 1, n_modes)
        D, E and F + M, where later masks read the marks [nm, or nm per mm of position], at the
        quoted sizes.
    """

    index: dict[str, int]
    sources: tuple[Source, ...]
    keys: tuple[Any, ...]
    modes: dict[Axis, ModeTable]
    pattern: dict[Axis, FloatArray]
    edge: dict[Axis, FloatArray]
    marks: dict[Axis, FloatArray]

    def overlay(
        self, axis: Axis, first: list[int], second: list[int], modes: IntArray | None = None
    ) -> FloatArray:
        """Return D_second - D_first, shape (n_pairs, n_modes), with cancelled modes exactly 0.

        Parameters
        ----------
        axis : {'x', 'y'}
            Axis of the overlay.
        first, second : list of int
            Rows of the layers, see `index`.
        modes : ndarray of int, optional
            Only these modes.
        """
        pattern = self.pattern[axis] if modes is None else self.pattern[axis][:, modes]
        a, b = pattern[first], pattern[second]
        difference = b - a
        difference[np.abs(difference) <= _DUST * (np.abs(a) + np.abs(b))] = 0.0
        return difference

    def telling(self, axis: Axis, layers: IntArray) -> IntArray:
        """Return the modes that tell some of these layers apart or move their edges.

        Parameters
        ----------
        axis : {'x', 'y'}
            Axis of the modes.
        layers : ndarray of int
            Rows of the layers, see `index`.

        Returns
        -------
        ndarray of int
            Columns of `pattern` and `edge`; every other one cancels between any two of the layers.
        """
        differs = np.ptp(self.pattern[axis][layers], axis=0) > 0
        return np.flatnonzero(differs | self.edge[axis][layers].any(axis=0))


def place(flow: Flow, *, apart: bool = False) -> Placement:
    """Place every layer of a flow.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    apart : bool
        Keep amounts apart by the place in the file that quotes them: one physical error with sizes in
        several places then counts as a source for each.

    Returns
    -------
    Placement
        Amounts of every source in every layer.
    """
    return assemble(flow, walked(flow, apart=apart))


def walked(flow: Flow, *, apart: bool = False) -> "Walk":
    """Return what enters every layer of a flow, collected; arguments as for `place`."""
    walk = Walk(flow, SourceBook(apart))
    for layer in flow.layers.values():
        walk.collect_edge(layer)
        if isinstance(layer, Mask):
            walk.collect_terms(layer)
            for axis in AXES:
                walk.parts[layer.id, "read", axis] = walk.reads(layer, layer.aligns_to.weighted(axis), axis)
    return walk


class Walk:
    """Collects what enters each part of each mask, in (mode, amount) lists.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    book : SourceBook
        Hands out the modes.
    """

    def __init__(self, flow: Flow, book: SourceBook) -> None:
        self.flow = flow
        self.book = book
        self.parts: dict[tuple[str, PartName, Axis], Amounts] = defaultdict(list)

    def collect_terms(self, mask: Mask) -> None:
        """Collect the mask's own and its tool's terms under the parts that they enter."""
        for tool, name, term in self.flow.terms_of(mask):
            for axis, mode, amount in self._term(mask, tool, name, term):
                self.parts[mask.id, term.enters, axis].append((mode, amount))

    def reads(self, mask: Mask, weighted: tuple[tuple[Reading, float], ...], axis: Axis) -> Amounts:
        """Return what reading these references along an axis adds to the mask's frame."""
        found: Amounts = []
        for reading, weight in weighted:
            factor = weight * _side(mask, "shift", axis)
            for label, size, place in self._read(mask, reading, axis):
                if isinstance(size, MarkSites):
                    serves = reading_axes(mask, reading, axis)
                    found += self._fitted(label, mask, size, axis, serves, weight, place)
                    continue
                found += self._shift(label, mask.id, size, axis, factor, place, reading_level)
        return found

    def collect_edge(self, layer: Mask | SelfAligned) -> None:
        """Collect the layer's edge errors."""
        cd = layer.cd if isinstance(layer, Mask) else None
        for label, name, size, share in (("CD", "cd", cd, 0.5), ("edge", "edge", layer.edge, 1.0)):
            if size is None:
                continue
            place = layer_keys(layer, name)
            for axis in AXES:
                amounts = self._shift(label, layer.id, size, axis, share, place, edge_level)
                self.parts[layer.id, "edge", axis] += amounts

    def _read(self, mask: Mask, reading: Reading, axis: Axis) -> Iterator[tuple[str, Size | MarkSites, Keys]]:
        tool = self.flow.tools[mask.tool]
        to_wafer = reading.mask == WAFER
        size = tool.wafer_alignment if to_wafer else tool.alignment
        place: Keys = ("tools", mask.tool, "wafer_alignment" if to_wafer else "alignment")
        if reading.alignment is not None:
            size, place = reading.alignment, reading_keys(mask, reading, axis)
        if size is not None:
            yield f"alignment to {reading.mask}", size, place
        marks = self.flow.layers.get(reading.mask)
        if isinstance(marks, Mask) and marks.mark_reading is not None:
            yield f"mark reading of {marks.id}", marks.mark_reading, layer_keys(marks, "mark_reading")

    def _shift(
        self,
        label: str,
        of: str,
        size: SizeParts,
        axis: Axis,
        factor: float,
        place: Keys,
        level: Callable[[SizeParts, Kind], Level],
    ) -> Amounts:
        """Amounts of an error of one layer on one axis that nothing else shares."""
        found: Amounts = []
        for kind, per_axis in size.parts():
            value = per_axis.on(axis).in_base(self.flow.unit)
            if value:
                source = Source(label, of, kind, "shift", value, level(size, kind))
                index = self.book.source((of, label, kind, axis), source, (place, kind, axis))
                found.append((self.book.mode(axis, index, 0), factor * value))
        return found

    def _fitted(
        self, label: str, mask: Mask, sites: MarkSites, axis: Axis, serves: str, weight: float, place: Keys
    ) -> Amounts:
        """Amounts on one axis of an alignment fitted to marks, fresh for each reading."""
        found: Amounts = []
        unit, per_mark = self.flow.unit, sites.per_mark
        varies = per_mark.varies or sites.over
        for kind, per_axis in per_mark.parts():
            read = {a: per_axis.on(a).in_base(unit) for a in AXES}
            # A sum over marks is close to normal whatever a single mark's readings are.
            as_random = deviation(kind, self.flow.sigma) / deviation("random", self.flow.sigma)
            for scalar in scalars(sites, unit, alike=read["x"] == read["y"]):
                value, leads = as_random * read[scalar.readings], scalar.leads
                name = label if leads.shape == "shift" else f"{label}: {scalar.name}"
                source = Source(name, mask.id, "random", leads.shape, abs(scalar.size) * value, varies)
                moves = scalar.amounts[axis] if mask.side == "front" else mirrored(scalar.amounts[axis], axis)
                if not value or not moves.any():
                    continue
                key = (mask.id, label, kind, scalar.name, serves)
                index = self.book.source(key, source, ((*place, PER_MARK), kind, scalar.readings))
                for basis in np.flatnonzero(moves):
                    mode = self.book.mode(axis, index, basis_over(int(basis), sites.over))
                    found.append((mode, weight * value * float(moves[basis])))
        return found

    def _term(self, mask: Mask, tool: str | None, name: str, term: Term) -> Iterator[tuple[Axis, int, float]]:
        place = term_keys(mask, tool, name)
        for kind, per_axis in term.parts():
            for axis in AXES:
                act = action(term.shape, term.over, axis)
                value = per_axis.on(axis).in_base(self.flow.unit)
                if act is None or not value:
                    continue
                basis, sign = act
                scalar = axis if term.shape in SHAPE_PER_AXIS else None
                size = quoted(per_axis, scalar).in_base(self.flow.unit)
                for key, label, of, share in _shares(mask, tool, name, term, kind):
                    level = term_level(term, kind, of_tool=tool is not None, common=key[0] != "own")
                    source = Source(label, of, kind, term.shape, size, level)
                    index = self.book.source((*key, kind, scalar), source, (place, kind, axis))
                    amount = sign * _side(mask, term.shape, axis) * share * value
                    yield axis, self.book.mode(axis, index, basis), amount


def _shares(
    mask: Mask, tool: str | None, name: str, term: Term, kind: Kind
) -> Iterator[tuple[tuple[str, ...], str, str, float]]:
    """Split a term into what is common and what is the mask's own: (key, name, of, share)."""
    own: tuple[str, ...] = ("own", mask.id, tool or "", name)
    shared: tuple[str, ...]
    if term.source is not None:
        shared, label, of = ("source", term.source), term.source, "shared source"
    else:
        shared, label, of = ("tool", tool or mask.id, name), name, tool or mask.id
    if kind == "offset":
        # Known and signed, so never split; a tool's moves each of its masks alike.
        yield (*(shared if tool else own), "offset"), label if tool else name, of if tool else mask.id, 1.0
        return
    common = term.common_share
    part, rest = (common, 1 - common) if kind == "bound" else (math.sqrt(common), math.sqrt(1 - common))
    if part:
        yield shared, label, of, part
    if rest:
        yield own, name, mask.id, rest


def _side(mask: Mask, shape: Shape, axis: Axis) -> int:
    """Sign of a shape seen from the front: on the back x is reversed (SEMI M20)."""
    mirrored = shape in ("rotation", "skew") or (shape == "shift" and axis == "x")
    return -1 if mask.side == "back" and mirrored else 1


def assemble(flow: Flow, walk: Walk) -> Placement:
    """Return every layer's place from what a walk collected in all of them."""
    tables, places = walk.book.tables()
    index = {WAFER: 0} | {name: i + 1 for i, name in enumerate(flow.layers)}
    patterns, edges, read = {}, {}, {}
    for axis in AXES:
        shape = (len(index), tables[axis].size)
        frame, device, marks, edge = (np.zeros(shape) for _ in range(4))

        def add(row: FloatArray, layer: str, part: PartName, axis: Axis = axis) -> None:
            for mode, amount in walk.parts.get((layer, part, axis), ()):
                row[places[axis][mode]] += amount

        for name, layer in flow.layers.items():
            i = index[name]
            add(edge[i], name, "edge")
            if isinstance(layer, SelfAligned):
                parent = index[layer.follows.on(axis)]
                frame[i], device[i], marks[i] = frame[parent], device[parent], marks[parent]
                edge[i] += layer.tone.sign(axis) * edge[parent]
                continue
            for reading, weight in layer.aligns_to.weighted(axis):
                frame[i] += weight * marks[index[reading.mask]]
            add(frame[i], name, "read")
            add(frame[i], name, "layer")
            device[i] = marks[i] = frame[i]
            add(device[i], name, "pattern")
            add(marks[i], name, "marks")
        patterns[axis], edges[axis], read[axis] = device, edge, marks
    return Placement(index, tuple(walk.book.sources), walk.book.keys, tables, patterns, edges, read)

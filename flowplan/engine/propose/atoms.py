"""A flow's placements in atoms: what each mask and each reading adds, ready to be recombined.

Most sources enter at one place alone: a mask's own terms, the reading of one mark. Whatever is chosen,
such sources stand in a residual with one common coefficient, so they are merged into one *atom* with a
variance, a bound and a linear sum. Sources that several masks share, and offsets, which are signed,
are kept as they are: as signed amounts at every site.
"""

from collections import defaultdict
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowplan.engine.margin import needs
from flowplan.engine.parts import Kernel
from flowplan.engine.placement import Amounts, Walk, place
from flowplan.engine.points import sites_of
from flowplan.engine.propose.worst_case import extreme_sites
from flowplan.engine.residual import residuals, rows_of
from flowplan.engine.sources import FloatArray, IntArray, ModeTable, SourceBook, deviation
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.candidates import Choice
from flowplan.model.edits import Readings
from flowplan.model.flow import Basis, Flow
from flowplan.model.masks import Mask, References, SelfAligned

#: What an atom is measured in, in the order of the last axis of `Parts.sizes`.
VARIANCE, BOUND, LINEAR = 0, 1, 2
_KINDS = 3


@dataclass(frozen=True, slots=True)
class Parts:
    """What enters at some places, at every site.

    Attributes
    ----------
    sizes : ndarray, shape (..., n_sites, 3)
        Variance [nm^2], bound [nm] and sum of |amount| sigma [nm] of what enters here alone.
    signed : ndarray, shape (..., n_sites, 1 + n_shared)
        Offset [nm], then the amount of each shared source [nm].
    """

    sizes: FloatArray
    signed: FloatArray


@dataclass(frozen=True, slots=True)
class Rows:
    """The judged pairs of one axis.

    Attributes
    ----------
    first, second : ndarray of int, shape (n_rows,)
        The masks under the two layers, by process order; the wafer is 0.
    edges : ndarray, shape (n_rows, 3)
        Variance, bound and linear sum of the edges.
    room : ndarray, shape (n_rows,)
        Drawn dimension plus the edges' offset less what must remain [nm].
    scale : ndarray, shape (n_rows,)
        Drawn dimension plus what must remain [nm]: what rounding is measured against.
    """

    first: IntArray
    second: IntArray
    edges: FloatArray
    room: FloatArray
    scale: FloatArray


@dataclass(frozen=True, slots=True)
class Reads:
    """The options of every mask along one axis, as arrays; unused places have weight 0.

    Attributes
    ----------
    masks : ndarray of int, shape (n_masks, n_options, n_references)
        Which masks' marks are read.
    weights : ndarray, same shape
        Their weights.
    parts : Parts, shape (n_masks, n_options, ...)
        What the readings add.
    count : ndarray of int, shape (n_masks,)
        How many options each mask has; the wafer has one that reads nothing.
    """

    masks: IntArray
    weights: FloatArray
    parts: Parts
    count: IntArray


@dataclass(frozen=True)
class AxisAtoms:
    """One axis of a flow with all its options.

    Attributes
    ----------
    axis : {'x', 'y'}
        The axis.
    layer, pattern, marks : Parts, shape (n_masks, ...)
        What enters at each mask, by process order; the wafer is 0 and adds nothing.
    reads : Reads
        The options.
    rows : Rows
        The judged pairs.
    shared_sigma, shared_bound : ndarray, shape (n_shared,)
        Standard deviation per amount of each shared source, and 1 for a bound.
    basis : {'mixed', 'rss', 'linear'}
        How bounds and random parts add up.
    confidence : float
        Standard deviations at which margins are taken.
    """

    axis: Axis
    layer: Parts
    pattern: Parts
    marks: Parts
    reads: Reads
    rows: Rows
    shared_sigma: FloatArray
    shared_bound: FloatArray
    basis: Basis
    confidence: float

    @property
    def n_masks(self) -> int:
        """Number of masks, the wafer included."""
        return len(self.reads.count)

    @property
    def n_sites(self) -> int:
        """Number of sites."""
        return int(self.layer.sizes.shape[1])

    @cached_property
    def has_bounds(self) -> bool:
        """Whether anything but edges and shared sources is bounded."""
        placed = (self.layer, self.pattern, self.marks, self.reads.parts)
        return any(bool(parts.sizes[..., BOUND].any()) for parts in placed)

    @cached_property
    def has_marks(self) -> bool:
        """Whether any error of marks is not shared."""
        return bool(self.marks.sizes.any())

    @cached_property
    def has_signed(self) -> bool:
        """Whether any offset or shared source is handed down to other masks."""
        handed = (self.layer, self.marks, self.reads.parts)
        return any(bool(parts.signed.any()) for parts in handed)

    @cached_property
    def most_read(self) -> IntArray:
        """The most references that any option of each mask reads, shape (n_masks,)."""
        return np.asarray((self.reads.weights > 0).sum(axis=2).max(axis=1), dtype=np.int64)

    def need(self, sizes: FloatArray) -> FloatArray:
        """Return what errors of these variances, bounds and linear sums take on the basis [nm]."""
        random = self.confidence * np.sqrt(sizes[..., VARIANCE])
        found = needs(sizes[..., BOUND], random, self.confidence * sizes[..., LINEAR])
        return found[self.basis]

    def shared_sizes(self, amounts: FloatArray) -> FloatArray:
        """Return variance, bound and linear sum of shared amounts, shape (..., 3)."""
        size = np.abs(amounts)
        parts = (size**2 @ self.shared_sigma**2, size @ self.shared_bound, size @ self.shared_sigma)
        return np.stack(parts, axis=-1)


def atoms_of(flow: Flow, choices: tuple[Choice, ...]) -> dict[Axis, AxisAtoms]:
    """Return both axes of a flow in atoms.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    choices : tuple of Choice
        What every mask may read.
    """
    walk = Walk(flow, SourceBook())
    reads: dict[Axis, list[list[tuple[Readings, Amounts]]]] = {
        axis: [_options(walk, mask, choices, axis) for mask in flow.masks] for axis in AXES
    }
    for mask in flow.masks:
        walk.collect_terms(mask)
    tables, places = walk.book.tables()
    sites = extreme_sites(sites_of(flow))
    return {a: _Builder(flow, walk, a, tables[a], places[a], sites).build(reads[a]) for a in AXES}


def _options(
    walk: Walk, mask: Mask, choices: tuple[Choice, ...], axis: Axis
) -> list[tuple[Readings, Amounts]]:
    choice = next(c for c in choices if c.mask == mask.id and axis in c.axes)
    found = []
    for option in choice.options:
        readings = option[choice.axes.index(axis)]
        weighted = References.model_construct(x=readings, y=readings).weighted(axis)
        found.append((readings, walk.reads(mask, weighted, axis)))
    return found


class _Builder:
    """Sums the walk's amounts into atoms for one axis."""

    def __init__(
        self, flow: Flow, walk: Walk, axis: Axis, table: ModeTable, place: IntArray, sites: FloatArray
    ) -> None:
        self.flow, self.walk, self.axis, self.table, self.place, self.sites = (
            flow,
            walk,
            axis,
            table,
            place,
            sites,
        )
        self.kinds = [source.kind for source in walk.book.sources]
        self.sigma = np.array([deviation(kind, flow.sigma) for kind in self.kinds])
        self.shared = {source: k for k, source in enumerate(self._shared_sources())}
        self.index = {WAFER: 0} | {mask.id: i + 1 for i, mask in enumerate(flow.masks)}
        for name, layer in flow.layers.items():
            if isinstance(layer, SelfAligned):
                self.index[name] = self.index[layer.follows.on(axis)]

    def build(self, reads: list[list[tuple[Readings, Amounts]]]) -> AxisAtoms:
        shared = list(self.shared)
        layer, pattern, marks = (self._own(part) for part in ("layer", "pattern", "marks"))
        return AxisAtoms(
            self.axis,
            layer,
            pattern,
            marks,
            self._reads(reads),
            self._rows(),
            self.sigma[shared],
            np.array([float(self.kinds[source] == "bound") for source in shared]),
            self.flow.basis,
            self.flow.confidence,
        )

    def _shared_sources(self) -> list[int]:
        """Return the sources other than offsets that enter at more than one place."""
        where = defaultdict(set)
        for (mask, part, axis), amounts in self.walk.parts.items():
            if axis == self.axis:
                for mode, _ in amounts:
                    where[int(self.table.source[self.place[mode]])].add((mask, part))
        return sorted(s for s, places in where.items() if len(places) > 1 and self.kinds[s] != "offset")

    def _own(self, part: str) -> Parts:
        names = [mask.id for mask in self.flow.masks]
        amounts = [self.walk.parts.get((name, part, self.axis), []) for name in names]
        return _stacked([self._parts([]), *(self._parts(a) for a in amounts)])

    def _parts(self, amounts: Amounts) -> Parts:
        by_source: dict[int, FloatArray] = defaultdict(lambda: np.zeros(self.sites.shape[1]))
        for mode, amount in amounts:
            at = self.place[mode]
            by_source[int(self.table.source[at])] += amount * self.sites[self.table.basis[at]]
        sizes = np.zeros((self.sites.shape[1], _KINDS))
        signed = np.zeros((self.sites.shape[1], 1 + len(self.shared)))
        for source, value in by_source.items():
            if self.kinds[source] == "offset":
                signed[:, 0] += value
            elif source in self.shared:
                signed[:, 1 + self.shared[source]] += value
            elif self.kinds[source] == "bound":
                sizes[:, BOUND] += np.abs(value)
            else:
                deviations = np.abs(value) * self.sigma[source]
                sizes[:, VARIANCE] += deviations**2
                sizes[:, LINEAR] += deviations
        return Parts(sizes, signed)

    def _reads(self, reads: list[list[tuple[Readings, Amounts]]]) -> Reads:
        count = np.array([1, *(len(options) for options in reads)])
        width = max(len(readings) for options in reads for readings, _ in options)
        masks = np.zeros((len(count), count.max(), width), dtype=np.int64)
        weights = np.zeros(masks.shape)
        empty = self._parts([])
        parts = [[empty] * int(count.max()) for _ in count]
        for i, options in enumerate(reads, start=1):
            for o, (readings, amounts) in enumerate(options):
                weighted = References.model_construct(x=readings, y=readings).weighted("x")
                masks[i, o, : len(readings)] = [self.index[r.mask] for r, _ in weighted]
                weights[i, o, : len(readings)] = [w for _, w in weighted]
                parts[i][o] = self._parts(amounts)
        return Reads(masks, weights, _stacked([_stacked(row) for row in parts]), count)

    def _rows(self) -> Rows:
        placement = place(self.flow)
        rows = tuple(r for r in rows_of(self.flow, self.flow.pairs) if r.axis == self.axis)
        res = residuals(self.flow, placement, rows, self.axis)
        kernel = Kernel.of(placement.modes[self.axis], placement.sources, self.flow.sigma)
        edges = kernel.by_source(res.edges)
        starts = kernel.table.starts
        sigma = kernel.sigma_by_source()
        sizes = (
            ((edges * sigma) ** 2).sum(axis=1),
            np.abs(edges) @ kernel.bound[starts],
            np.abs(edges) @ sigma,
        )
        keep = ~np.isnan(res.drawn)
        return Rows(
            np.array([self.index[r.first] for r in rows], dtype=np.int64)[keep],
            np.array([self.index[r.second] for r in rows], dtype=np.int64)[keep],
            np.stack(sizes, axis=-1)[keep],
            (res.drawn + edges @ kernel.offset[starts] - res.keep)[keep],
            (np.abs(res.drawn) + np.abs(res.keep))[keep],
        )


def _stacked(parts: list[Parts]) -> Parts:
    return Parts(np.stack([p.sizes for p in parts]), np.stack([p.signed for p in parts]))

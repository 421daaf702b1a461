"""Why two layers lie apart as they do: hop by hop, what cancels, and what a direct reading would give.

Every figure is taken at one point, the worst for the overlay of the two layers.
"""

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.graph import Chain
from flowplan.engine.margin import budget_of, figures_at, worst_sites
from flowplan.engine.residual import Residuals, Row, residuals
from flowplan.engine.results import VERDICTS, Entry, Parts, SourceRow, Verdict
from flowplan.engine.sources import FloatArray, Source
from flowplan.errors import Diagnostic, UsageError
from flowplan.model.base import WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.masks import Mask, Reading, References, SelfAligned
from flowplan.model.pairs import Overlay

Effect = Literal["cancels", "shrinks", "grows"]
_SAME = 1e-9


@dataclass(frozen=True, slots=True)
class Hop:
    """One step of the chain.

    Attributes
    ----------
    child, reference : str
        Who takes its place from whom.
    follows : bool
        Whether the child is a self-aligned feature; else it reads the reference's marks.
    weight : float
        Share of this reference in the child's average; 1 for a single reference.
    overlay : Parts
        The hop's own overlay, D_child - D_reference [nm].
    sources : tuple of SourceRow
        What enters, the largest share first.
    """

    child: str
    reference: str
    follows: bool
    weight: float
    overlay: Parts
    sources: tuple[SourceRow, ...]


@dataclass(frozen=True, slots=True)
class Shared:
    """A source whose parts meet in the overlay of the two layers.

    Attributes
    ----------
    source : Source
        The source.
    in_first, in_second : float
        Its signed parts in the two placements [nm at the quoted size].
    in_overlay : float
        What is left of it in D_second - D_first [nm].
    apart : float
        What adding it up part by part would count [nm]: over the hops of the chain, or over the two
        placements where it enters at no hop or references are averaged.
    in_hops : bool
        Whether it enters at a hop; if not, both layers inherit it from further up or share a tool.
    """

    source: Source
    in_first: float
    in_second: float
    in_overlay: float
    apart: float
    in_hops: bool

    @property
    def effect(self) -> Effect:
        """Whether it is gone, or smaller or larger than part by part."""
        if self.in_overlay == 0:
            return "cancels"
        return "shrinks" if abs(self.in_overlay) < self.apart else "grows"


@dataclass(frozen=True, slots=True)
class Explanation:
    """The overlay of two layers on one axis, taken apart.

    Attributes
    ----------
    entry : Entry
        The overlay of the second layer against the first, without a limit.
    hops : tuple of Hop
        Along the chain, from the first layer to the second.
    shared : tuple of Shared
        What cancels, shrinks or grows, the largest change first.
    """

    entry: Entry
    hops: tuple[Hop, ...]
    shared: tuple[Shared, ...]

    @property
    def excess(self) -> float | None:
        """How far plain chain RSS is above (below, if negative) the exact random part, as a share."""
        exact, hand = self.entry.overlay.random, self.entry.chain_rss
        if hand is None or exact == 0:
            return None
        return hand / exact - 1


@dataclass(frozen=True, slots=True)
class Change:
    """One entry of the flow as it is, and as it would be."""

    before: Entry
    after: Entry


@dataclass(frozen=True, slots=True)
class Direct:
    """What would come of reading the earlier layer's marks directly.

    Attributes
    ----------
    later, earlier : str
        The mask that reads, and what it reads.
    refusal : str
        Why this cannot be, or already is; empty when it can.
    overlay : Change or None
        The overlay of the two layers; None when refused.
    pairs : tuple of Change
        The judged pairs of these two layers on the axis.
    counts : tuple of two dict
        Verdict counts of the whole flow, before and after.
    """

    later: str
    earlier: str
    refusal: str
    overlay: Change | None = None
    pairs: tuple[Change, ...] = ()
    counts: tuple[dict[Verdict, int], dict[Verdict, int]] = ({}, {})


def explain(engine: Engine, first: str, second: str, axis: Axis) -> Explanation:
    """Take the overlay of two layers apart.

    Parameters
    ----------
    engine : Engine
        A placed flow.
    first, second : str
        Two different layers, or ``wafer``.
    axis : {'x', 'y'}
        The axis.

    Returns
    -------
    Explanation
        All lengths in nm, at the worst point of this overlay.

    Raises
    ------
    UsageError
        FP602, when both are the same layer.
    """
    entry = _overlay_entry(engine, first, second, axis)
    at = _basis_at_worst(engine, entry)
    hops = tuple(_hop(engine, child, reference, axis, at) for child, reference in entry.chain.hops())
    return Explanation(entry, hops, _shared(engine, entry.chain, (first, second), axis, at))


def direct(engine: Engine, first: str, second: str, axis: Axis) -> Direct:
    """Return what aligning the later of two layers directly to the earlier one would give.

    Parameters
    ----------
    engine : Engine
        A placed flow.
    first, second : str
        Two different layers.
    axis : {'x', 'y'}
        The axis on which the reading changes; the other axis stays.
    """
    order = [WAFER, *engine.flow.layers]
    earlier, later = sorted((first, second), key=order.index)
    refusal = _refusal(engine, later, earlier, axis)
    if refusal:
        return Direct(later, earlier, refusal)
    other = Engine.of(_read_directly(engine.flow, later, earlier, axis))
    before, after = engine.entries(), other.entries()
    between = [
        Change(a, b)
        for a, b in zip(before, after, strict=True)
        if a.axis == axis and set(a.layers) == {first, second}
    ]
    overlay = Change(*(_overlay_entry(e, first, second, axis) for e in (engine, other)))
    return Direct(later, earlier, "", overlay, tuple(between), (_counts(before), _counts(after)))


def _overlay_entry(engine: Engine, first: str, second: str, axis: Axis) -> Entry:
    if first == second:
        raise UsageError([Diagnostic("FP602", f"{first!r} is named twice", "name two different layers")])
    pair = Overlay(rule="overlay", name=f"{second} on {first}", between=(first, second), axes=axis)
    return engine.entries([pair])[0]


def _basis_at_worst(engine: Engine, entry: Entry) -> FloatArray:
    """Return the basis functions at the point where the engine took the entry, shape (n_basis, 1)."""
    view = engine.view(entry.axis)
    res = residuals(engine.flow, engine.placement, (Row(entry.pair, *entry.layers, entry.axis),), entry.axis)
    worst = int(worst_sites(res, view.kernel, engine.sites, engine.flow)[0])
    return engine.sites.basis[:, worst : worst + 1]


def _hop(engine: Engine, child: str, reference: str, axis: Axis, at: FloatArray) -> Hop:
    view, index = engine.view(axis), engine.placement.index
    overlay = engine.placement.overlay(axis, [index[reference]], [index[child]])
    pair = Overlay(rule="overlay", between=(reference, child))
    none = np.zeros(1)
    res = Residuals((Row(pair, reference, child, axis),), overlay, np.zeros_like(overlay), none, none)
    figures = figures_at(res, view.kernel, at, engine.flow.confidence)
    parts = Parts(
        float(figures.overlay_offset[0]), float(figures.overlay_bound[0]), float(figures.overlay_random[0])
    )
    weight = dict(engine.graph.references(child, axis=axis))[reference]
    follows = isinstance(engine.flow.layers[child], SelfAligned)
    return Hop(child, reference, follows, weight, parts, budget_of(view, figures, 0).rows())


def _shared(
    engine: Engine, chain: Chain, layers: tuple[str, str], axis: Axis, at: FloatArray
) -> tuple[Shared, ...]:
    placement, kernel = engine.placement, engine.view(axis).kernel
    first, second = (placement.index[layer] for layer in layers)
    placed = placement.pattern[axis][[first, second]]
    steps = [(placement.index[r], placement.index[c]) for c, r in chain.hops()]
    hops = placement.overlay(axis, [r for r, _ in steps], [c for _, c in steps])
    over = placement.overlay(axis, [first], [second])
    a, b = kernel.at_points(placed, np.repeat(at, 2, axis=1))
    left = kernel.at_points(over, at)[0]
    by_hop = kernel.at_points(hops, np.repeat(at, len(steps), axis=1))
    found = []
    for i, number in enumerate(kernel.table.active):
        source, parts = placement.sources[number], [float(v) for v in by_hop[:, i]]
        apart = _apart(source, float(a[i]), float(b[i]), [] if chain.one_of_several else parts)
        if apart and abs(abs(left[i]) - apart) > _SAME * apart:
            found.append(Shared(source, float(a[i]), float(b[i]), float(left[i]), apart, any(parts)))
    return tuple(sorted(found, key=lambda row: abs(row.in_overlay) - row.apart))


def _apart(source: Source, first: float, second: float, hops: list[float]) -> float:
    """Return what a source would come to if its parts were added as if they were strangers."""
    if source.kind == "offset":
        hops = []  # their signs are known, so nobody adds them wrongly hop by hop
    inherited = [first, second] if first and second else []
    parts = hops if any(hops) else inherited
    return sum(map(abs, parts)) if source.kind in ("bound", "offset") else math.hypot(*parts)


def _refusal(engine: Engine, later: str, earlier: str, axis: Axis) -> str:
    layer = engine.flow.layers[later]
    if isinstance(layer, SelfAligned):
        return f"{later} is self-aligned: it follows {layer.follows.on(axis)} and has no exposure to align"
    if engine.graph.references(later, axis=axis) == ((earlier, 1.0),):
        return f"{later} already aligns directly to {earlier}"
    return ""


def _read_directly(flow: Flow, later: str, earlier: str, axis: Axis) -> Flow:
    """Return the flow with one mask's references on one axis replaced by one reading."""

    def changed(mask: Mask) -> Mask:
        if mask.id != later:
            return mask
        known = {r.mask: r.alignment for r in mask.aligns_to.on(axis)}
        reading = (Reading(mask=earlier, alignment=known.get(earlier)),)
        x, y = (reading if a == axis else mask.aligns_to.on(a) for a in ("x", "y"))
        return mask.model_copy(update={"aligns_to": References(x=x, y=y)})

    return flow.model_copy(update={"masks": tuple(changed(mask) for mask in flow.masks)})


def _counts(entries: tuple[Entry, ...]) -> dict[Verdict, int]:
    verdicts = [e.verdict for e in entries]
    return {verdict: verdicts.count(verdict) for verdict in VERDICTS}

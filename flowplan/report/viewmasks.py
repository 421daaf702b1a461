"""The mask table as a handoff needs it, and the self-aligned steps."""

from dataclasses import dataclass

from flowplan.model.base import AXES, PerAxis
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Mask, SelfAligned
from flowplan.model.terms import SizeParts
from flowplan.report.viewbase import NONE, Base, LayerName, percent
from flowplan.report.viewpairs import remarks_of
from flowplan.units import Quantity


@dataclass(frozen=True, slots=True)
class ReadView:
    """A reference that is read, with its weight where several are averaged."""

    layer: LayerName
    weight: str


@dataclass(frozen=True, slots=True)
class PairLink:
    """A pair that a layer takes part in."""

    anchor: str
    name: str


@dataclass(frozen=True, slots=True)
class MaskRow:
    """One mask or self-aligned feature."""

    anchor: str
    order: str
    id: str
    kind: str
    title: str
    tool: str
    tool_anchor: str
    side: str
    reads_x: tuple[ReadView, ...]
    reads_y: tuple[ReadView, ...]
    read_by: tuple[LayerName, ...]
    edge: str
    mark_reading: str
    remarks: tuple[tuple[str, str], ...]
    pairs: tuple[PairLink, ...]


@dataclass(frozen=True, slots=True)
class FeatureView:
    """A self-aligned step and the pairs whose overlay error it takes to exactly 0."""

    layer: LayerName
    title: str
    follows: str
    tone: str
    edge: str
    remarks: tuple[tuple[str, str], ...]
    settled: tuple[str, ...]


def size_words(base: Base, size: SizeParts | MarkSites | None) -> str:
    """Return a size as the file quotes it, every part with its unit."""
    if size is None:
        return NONE
    if isinstance(size, MarkSites):
        return f"{size_words(base, size.per_mark)} a mark, {size}"
    unit, sigma = base.result.flow.unit, f"{base.result.flow.sigma:g}σ"
    how = {"random": f" ({sigma})", "uniform": " half-width, uniform", "bound": " bound", "offset": " offset"}
    words = []
    for kind, per_axis in size.parts():
        sign = "" if kind == "offset" else "±"
        words.append(_per_axis(per_axis, unit, sign) + how[kind])
    return ", ".join(words)


def _per_axis(value: PerAxis, unit: str, sign: str) -> str:
    def one(quantity: Quantity) -> str:
        text = str(quantity if quantity.unit else Quantity(quantity.value, unit))
        return sign + text.replace("-", "\N{MINUS SIGN}")

    return one(value.x) if value.x == value.y else f"x {one(value.x)}, y {one(value.y)}"


def masks_view(base: Base, tool_anchors: dict[str, str]) -> tuple[MaskRow, ...]:
    """Return every layer in process order.

    Parameters
    ----------
    base : Base
        The result.
    tool_anchors : dict of str to str
        Anchor of each tool's block.
    """
    pairs: dict[str, dict[str, PairLink]] = {}
    for entry in base.result.entries:
        for name in entry.layers:
            anchor = base.pair_anchor(entry)
            pairs.setdefault(name, {})[anchor] = PairLink(anchor, entry.pair.name)
    for landing in base.result.landings:
        for name in landing.layers:
            anchor = base.landing_anchor(landing)
            pairs.setdefault(name, {})[anchor] = PairLink(anchor, landing.pair.name)
    rows, step = [], 0
    for name, layer in base.result.flow.layers.items():
        step += isinstance(layer, Mask)
        rows.append(_row(base, name, step, tool_anchors, tuple(pairs.get(name, {}).values())))
    return tuple(rows)


def _row(
    base: Base, name: str, step: int, tool_anchors: dict[str, str], pairs: tuple[PairLink, ...]
) -> MaskRow:
    layer = base.result.flow.layers[name]
    graph = base.result.engine.graph
    reads = [
        tuple(
            ReadView(base.names[ref], "" if weight == 1 else percent(weight))
            for ref, weight in graph.references(name, axis=axis)
        )
        for axis in AXES
    ]
    readers = {reader: base.names[reader] for axis in AXES for reader in graph.readers(name, axis=axis)}
    is_mask = isinstance(layer, Mask)
    cd = layer.cd if isinstance(layer, Mask) else None
    edge = (
        f"CD {size_words(base, cd)}" if cd else f"edge {size_words(base, layer.edge)}" if layer.edge else NONE
    )
    return MaskRow(
        anchor=base.names[name].anchor,
        order=str(step) if is_mask else NONE,
        id=name,
        kind="mask" if is_mask else "self-aligned",
        title=layer.title,
        tool=layer.tool if isinstance(layer, Mask) else NONE,
        tool_anchor=tool_anchors[layer.tool] if isinstance(layer, Mask) else "",
        side=layer.side if isinstance(layer, Mask) else NONE,
        reads_x=reads[0],
        reads_y=reads[1],
        read_by=tuple(readers.values()),
        edge=edge,
        mark_reading=size_words(base, layer.mark_reading if isinstance(layer, Mask) else None),
        remarks=tuple(r for r in remarks_of(layer) if r[0] != "Title"),
        pairs=pairs,
    )


def features_view(base: Base) -> tuple[FeatureView, ...]:
    """Return the self-aligned steps with the pairs that they settle."""
    return tuple(
        FeatureView(
            base.names[feature.id],
            feature.title,
            _both(feature.follows.x, feature.follows.y),
            _both(feature.tone.x, feature.tone.y),
            size_words(base, feature.edge),
            tuple(r for r in remarks_of(feature) if r[0] != "Title"),
            settled_by(base, feature),
        )
        for feature in base.result.flow.self_aligned
    )


def settled_by(base: Base, feature: SelfAligned) -> tuple[str, ...]:
    """Return the checks with no overlay error at all whose chain leads over the feature."""
    return tuple(
        f"{e.pair.name} in {e.axis}"
        for e in base.result.entries
        if feature.id in e.chain.layers and not any((e.overlay.offset, e.overlay.bound, e.overlay.random))
    )


def _both(x: str, y: str) -> str:
    return x if x == y else f"x {x}, y {y}"

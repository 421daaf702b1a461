"""What-if: a flow with one thing changed, as a new flow.

Every function returns a new frozen flow and leaves the old one as it was; the result is complete,
so it goes to the engine like any other.
"""

from collections.abc import Iterable, Mapping
from typing import TypeVar

from flowplan.model.base import AXES, Axis, PerAxis
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Follows, Mask, Reading, References, SelfAligned, Tone, Tones
from flowplan.model.pairs import AnyPair
from flowplan.model.paths import PER_MARK, Keys, Quoted, reading_keys
from flowplan.model.terms import Size, SizeParts
from flowplan.model.tools import Tool
from flowplan.units import Quantity

Readings = tuple[Reading, ...]
_AnySize = TypeVar("_AnySize", bound=SizeParts | MarkSites)
_Holder = TypeVar("_Holder", Tool, Mask, SelfAligned)


def with_references(flow: Flow, choices: Mapping[tuple[str, Axis], Readings]) -> Flow:
    """Return the flow with other references.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    choices : mapping of (mask id, axis) to readings
        What each named mask reads along that axis; all others stay.

    Returns
    -------
    Flow
        The changed flow.
    """

    def changed(mask: Mask) -> Mask:
        per_axis = {axis: choices.get((mask.id, axis), mask.aligns_to.on(axis)) for axis in AXES}
        references = References.model_construct(x=per_axis["x"], y=per_axis["y"])
        return mask if references == mask.aligns_to else mask.model_copy(update={"aligns_to": references})

    return flow.model_copy(update={"masks": tuple(changed(mask) for mask in flow.masks)})


def self_aligned(
    flow: Flow, layer: str, parent: str, axes: Iterable[Axis] = AXES, *, tone: Tone = "same"
) -> Flow:
    """Return the flow with a mask's layer made by a self-aligned step instead.

    Along axes not named the feature follows what the mask read first there, so that a step can be
    self-aligned in one direction only. Each edge keeps its own variation; half of a CD, since that is
    what moves one edge.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    layer : str
        The mask that is dropped; a feature of the same id takes its place.
    parent : str
        The layer whose pattern it follows.
    axes : iterable of {'x', 'y'}
        Where it follows `parent`.
    tone : {'same', 'opposite'}
        Whether it grows with the parent, or where the parent shrinks.

    Returns
    -------
    Flow
        The changed flow; pairs keep pointing at the id.

    Raises
    ------
    KeyError
        When there is no such mask.
    """
    mask = next((m for m in flow.masks if m.id == layer), None)
    if mask is None:
        raise KeyError(layer)
    chosen = set(axes)
    follows = {a: parent if a in chosen else mask.aligns_to.on(a)[0].mask for a in AXES}
    feature = SelfAligned(
        id=mask.id,
        title=mask.title,
        notes=mask.notes,
        owner=mask.owner,
        why=mask.why,
        follows=Follows(**follows),
        tone=Tones(x=tone, y=tone),
        edge=mask.edge if mask.cd is None else _halved(mask.cd),
    )
    return flow.model_copy(
        update={
            "masks": tuple(m for m in flow.masks if m.id != layer),
            "self_aligned": (*flow.self_aligned, feature),
        }
    )


def _halved(size: Size) -> Size:
    parts = {
        kind: PerAxis(**{a: Quantity(given.on(a).value / 2, given.on(a).unit) for a in AXES})
        for kind, given in size.parts()
    }
    return Size(**parts)


def with_drawn(flow: Flow, name: str, axis: Axis, drawn_nm: float) -> Flow:
    """Return the flow with another drawn dimension, or limit, of one pair on one axis.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    name : str
        The pair's name.
    axis : {'x', 'y'}
        The axis.
    drawn_nm : float
        The new value [nm].
    """

    def changed(pair: AnyPair) -> AnyPair:
        if pair.name != name:
            return pair
        key = "limit" if pair.rule == "overlay" else "drawn"
        old = getattr(pair, key)
        values = {a: getattr(old, a) for a in AXES} | {axis: Quantity(drawn_nm, "nm")}
        return pair.model_copy(update={key: PerAxis(**values)})

    return flow.model_copy(update={"pairs": tuple(changed(pair) for pair in flow.pairs)})


def with_size(flow: Flow, quoted: Quoted, size: Quantity) -> Flow:
    """Return the flow with another size at one place.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    quoted : Quoted
        The place, one of `quoted_sizes(flow)`; a number that serves both axes changes on both.
    size : Quantity
        The new size.

    Returns
    -------
    Flow
        The changed flow.

    Raises
    ------
    ValueError
        When the size is negative or measures something else than the old one.
    """
    if not size.value >= 0 or size.dimension != quoted.size.dimension:
        msg = f"{size} cannot be the size of {quoted.path}"
        raise ValueError(msg)
    group, owner = quoted.keys[:2]
    if group == "tools":
        return flow.model_copy(
            update={"tools": flow.tools | {owner: _in_holder(flow.tools[owner], quoted, size)}}
        )
    if group == "masks":
        masks = tuple(_in_mask(m, quoted, size) if m.id == owner else m for m in flow.masks)
        return flow.model_copy(update={"masks": masks})
    features = tuple(_in_holder(f, quoted, size) if f.id == owner else f for f in flow.self_aligned)
    return flow.model_copy(update={"self_aligned": features})


def _in_holder(holder: _Holder, quoted: Quoted, size: Quantity) -> _Holder:
    name = quoted.keys[2]
    old = getattr(holder, name)
    if name == "terms":
        term = quoted.keys[3]
        new = old | {term: _resized(old[term], quoted, size)}
    else:
        new = _resized(old, quoted, size)
    return holder.model_copy(update={name: new})


def _in_mask(mask: Mask, quoted: Quoted, size: Quantity) -> Mask:
    if quoted.keys[2] != "aligns_to":
        return _in_holder(mask, quoted, size)
    per_axis = {
        axis: tuple(_in_reading(mask, reading, axis, quoted, size) for reading in mask.aligns_to.on(axis))
        for axis in AXES
    }
    return mask.model_copy(update={"aligns_to": References.model_construct(x=per_axis["x"], y=per_axis["y"])})


def _in_reading(mask: Mask, reading: Reading, axis: Axis, quoted: Quoted, size: Quantity) -> Reading:
    keys: Keys = reading_keys(mask, reading, axis)
    if keys != quoted.keys[: len(keys)] or reading.alignment is None:
        return reading
    return reading.model_copy(update={"alignment": _resized(reading.alignment, quoted, size)})


def _resized(old: _AnySize, quoted: Quoted, size: Quantity) -> _AnySize:
    if isinstance(old, MarkSites):
        return old.model_copy(update={PER_MARK: _resized(old.per_mark, quoted, size)})
    before: PerAxis = getattr(old, quoted.kind)
    after = {axis: size if axis in quoted.axes else before.on(axis) for axis in AXES}
    return old.model_copy(update={quoted.kind: PerAxis.model_construct(x=after["x"], y=after["y"])})

"""Single changes of a flow, as data: what is changed, and the flow with the change made."""

from dataclasses import dataclass

from flowplan.model.base import Axis
from flowplan.model.edits import Readings, self_aligned, with_drawn, with_references, with_size
from flowplan.model.flow import Flow
from flowplan.model.masks import Tone
from flowplan.model.paths import Quoted


@dataclass(frozen=True, slots=True)
class Reread:
    """A mask reads other references.

    Attributes
    ----------
    mask : str
        The mask.
    axes : tuple of {'x', 'y'}
        The axes on which its references change.
    before, after : tuple of Readings
        What it reads, one entry an axis.
    """

    mask: str
    axes: tuple[Axis, ...]
    before: tuple[Readings, ...]
    after: tuple[Readings, ...]


@dataclass(frozen=True, slots=True)
class SelfAlign:
    """A mask's layer is made by a step that aligns itself to another layer."""

    layer: str
    parent: str
    tone: Tone


@dataclass(frozen=True, slots=True)
class Redraw:
    """A pair is drawn with another dimension, or gets another limit, on one axis [nm]."""

    pair: str
    axis: Axis
    before: float
    after: float


@dataclass(frozen=True, slots=True)
class Resize:
    """One quoted size becomes another [nm, urad or ppm]."""

    quoted: Quoted
    before: float
    after: float


Change = Reread | SelfAlign | Redraw | Resize


def apply(flow: Flow, change: Change) -> Flow:
    """Return the flow with a change made.

    Parameters
    ----------
    flow : Flow
        The flow that the change was found for.
    change : Change
        One of the four kinds.
    """
    if isinstance(change, Reread):
        return with_references(
            flow, {(change.mask, axis): after for axis, after in zip(change.axes, change.after, strict=True)}
        )
    if isinstance(change, SelfAlign):
        return self_aligned(flow, change.layer, change.parent, tone=change.tone)
    if isinstance(change, Redraw):
        return with_drawn(flow, change.pair, change.axis, change.after)
    return with_size(flow, change.quoted, change.quoted.quantity(change.after, flow.unit))

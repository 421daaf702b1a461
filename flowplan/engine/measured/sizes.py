"""Which sizes of a flow follow from measured overlay.

A mask measured against the one reference that it reads along an axis tells that reading's alignment: the
rest of the overlay's variance is the flow's other terms, at the places measured. So

    alignment^2 = measured variance - variance of the other terms

(without what is drawn once for the mask set, which is in the mean and not in the spread), and the mean,
less what the flow already knows as an offset, is the alignment's offset, unless it lies within two of its
standard errors. The plan then says of that reading what was measured. Overlay of layers that do not read
each other is a sum of several readings, and an average does not tell its readings apart: from these
nothing is written.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Engine
from flowplan.engine.measured.planned import planned
from flowplan.engine.measured.summary import Measured, MeasuredReading
from flowplan.engine.sources import N_BASIS
from flowplan.model.base import AXES, WAFER, Axis, PerAxis
from flowplan.model.edits import Readings, with_references
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Mask, Reading
from flowplan.model.terms import Level, Size
from flowplan.model.tools import Tool
from flowplan.units import Quantity, convert, significant

_DIGITS = 3
#: A mean within so many of its standard errors is no known offset.
_CERTAIN = 2.0


@dataclass(frozen=True, slots=True)
class Found:
    """A reading's alignment along one axis.

    Attributes
    ----------
    mask, reference : str
        Who reads whom.
    axis : {'x', 'y'}
        Along which axis.
    random, offset : float
        At the flow's `sigma`, and signed, in the flow's unit; rounded.
    error : float or None
        Standard error of `random`, about; None where it is 0 or one wafer tells nothing.
    exceeded : bool
        Whether the flow's other terms alone are larger than what was measured, so that 0 is left and
        the flow keeps its own figure.
    varies : str or None
        How often the flow says that the alignment is redrawn; this stays.
    """

    mask: str
    reference: str
    axis: Axis
    random: float
    offset: float
    error: float | None
    exceeded: bool
    varies: Level | None = None


@dataclass(frozen=True, slots=True)
class Sizes:
    """What measured overlay says about a flow's sizes.

    Attributes
    ----------
    found : tuple of Found
        In process order.
    silent : tuple of str
        Why the other measured readings say nothing.
    """

    found: tuple[Found, ...]
    silent: tuple[str, ...]

    def choices(self) -> dict[tuple[str, Axis], Readings]:
        """Return what each mask reads, with the alignments found."""
        by_reading: dict[tuple[str, str], list[Found]] = {}
        for one in self.found:
            if one.exceeded:
                continue
            by_reading.setdefault((one.mask, one.reference), []).append(one)
        chosen: dict[tuple[str, Axis], Readings] = {}
        for (mask, reference), both in by_reading.items():
            size = _size(both)
            for one in both:
                chosen[mask, one.axis] = (Reading(mask=reference, alignment=size),)
        return chosen

    def origins(self, measured: Measured, data: str) -> dict[str, str]:
        """Return by mask what its measured alignment comes from, for a comment in the flow file.

        Parameters
        ----------
        measured : Measured
            What the sizes were taken from.
        data : str
            What the data are called.
        """
        unit = measured.flow.unit
        readings = {(reading.mask, reading.reference): reading for reading in measured.readings}
        by_reading: dict[tuple[str, str], list[Found]] = {}
        for one in self.found:
            if not one.exceeded:
                by_reading.setdefault((one.mask, one.reference), []).append(one)
        notes: dict[str, list[str]] = {}
        for (mask, reference), both in by_reading.items():
            reading = readings[mask, reference]
            tally = reading.tally
            axes = " and ".join(one.axis for one in both)
            spread = ", ".join(
                f"{one.axis} {convert(reading.axes[one.axis].three_sigma, 'nm', unit):.4g}" for one in both
            )
            doubt = ", ".join(f"{one.axis} {one.error:.2g}" for one in both if one.error)
            notes.setdefault(mask, []).append(
                f"alignment to {reference} along {axes} from {data}, {tally.n} rows on {tally.n_wafers} "
                f"wafers of {tally.n_lots} lots, overlay 3 sigma {spread} {unit}"
                + (f", standard error of the alignment {doubt} {unit}" if doubt else "")
            )
        return {mask: "; ".join(parts) for mask, parts in notes.items()}


def sizes_of(measured: Measured) -> Sizes:
    """Return the alignments that measured overlay tells.

    Parameters
    ----------
    measured : Measured
        Measured overlay beside its flow.

    Returns
    -------
    Sizes
        One for each mask and axis that reads one measured reference alone.
    """
    flow = measured.flow
    masks = {mask.id: mask for mask in flow.masks}
    direct: list[tuple[MeasuredReading, Axis]] = []
    silent: list[str] = []
    for reading in measured.readings:
        for axis in AXES:
            reason = _reason(flow.tools, masks.get(reading.mask), reading, axis)
            if reason:
                silent.append(f"{reading.name}, {axis}: {reason}")
            else:
                direct.append((reading, axis))
    bare: dict[tuple[str, Axis], Readings] = {
        (reading.mask, axis): (Reading(mask=reading.reference, alignment=Size(random=0)),)
        for reading, axis in direct
    }
    engine = Engine.of(with_references(flow, bare))
    return Sizes(tuple(_found(engine, masks[r.mask], r, axis) for r, axis in direct), tuple(silent))


def alignment_of(tool: Tool, reading: Reading) -> Size | MarkSites | None:
    """Return the alignment that a flow quotes for a reading: its own, or the tool's."""
    if reading.alignment is not None:
        return reading.alignment
    return tool.wafer_alignment if reading.mask == WAFER else tool.alignment


def _reason(tools: Mapping[str, Tool], mask: Mask | None, reading: MeasuredReading, axis: Axis) -> str:
    """Return why a measured reading does not tell an alignment; empty when it does."""
    if mask is None:
        return f"{reading.mask} is no mask of the flow"
    read = mask.aligns_to.on(axis)
    if reading.reference not in [r.mask for r in read]:
        return f"{mask.id} does not read {reading.reference}"
    if len(read) > 1:
        return f"{mask.id} averages several references"
    own = alignment_of(tools[mask.tool], read[0])
    if isinstance(own, MarkSites):
        return f"the alignment of {mask.id} follows from its mark sites"
    if reading.tally.n < 2 or not math.isfinite(reading.axes[axis].sigma):
        return "one row has no spread"
    return ""


def _found(engine: Engine, mask: Mask, reading: MeasuredReading, axis: Axis) -> Found:
    flow, tally, figures = engine.flow, reading.tally, reading.axes[axis]
    moments = tally.rows[:N_BASIS, :N_BASIS] / tally.n
    rest = planned(engine, reading.mask, reading.reference, axis, moments)
    left = figures.sigma**2 - rest.spread
    random = convert(flow.sigma * float(np.sqrt(max(left, 0.0))), "nm", flow.unit)
    own = alignment_of(flow.tools[mask.tool], mask.aligns_to.on(axis)[0])
    varies = own.varies if isinstance(own, Size) else None
    # On the back x is reversed: a shift there acts with the other sign.
    turn = -1 if mask.side == "back" and axis == "x" else 1
    error = figures.mean_error
    shift = figures.mean - rest.offset
    certain = error is not None and abs(shift) > _CERTAIN * error
    offset = turn * convert(shift, "nm", flow.unit) if certain else 0.0
    size = max(random, abs(offset), convert(figures.three_sigma, "nm", flow.unit))
    step = 10.0 ** (math.floor(math.log10(size)) + 1 - _DIGITS) if size else 1.0
    return Found(
        mask.id,
        reading.reference,
        axis,
        random=_rounded(random, step),
        offset=_rounded(offset, step),
        error=_error(reading, axis, left, flow),
        exceeded=left < 0,
        varies=varies,
    )


def _error(reading: MeasuredReading, axis: Axis, left: float, flow: Flow) -> float | None:
    """Return the standard error of an alignment in the flow's unit.

    What wafers have in common is the part known worst: the variance of n wafers has the standard error
    sqrt(2 / (n - 1)) of itself, and that of a root is half of it over the root.
    """
    n, split = reading.tally.n_wafers, reading.axes[axis].split
    if n < 2 or left <= 0:
        return None
    common = max(split.lot or 0.0, 0.0) + max(split.wafer or 0.0, 0.0)
    of_variance = common * math.sqrt(2 / (n - 1))
    return significant(convert(flow.sigma * of_variance / (2 * math.sqrt(left)), "nm", flow.unit), 3)


def _rounded(value: float, step: float) -> float:
    return significant(round(value / step) * step) + 0.0


def _size(found: list[Found]) -> Size:
    """Return an alignment as a flow file has it; where one axis was read, one number says it all."""
    known = {one.axis: one for one in found}
    random = {axis: _quantity(known, axis, "random") for axis in AXES}
    offset = {axis: _quantity(known, axis, "offset") for axis in AXES}
    parts: dict[str, PerAxis] = {"random": PerAxis(**random)}
    if any(one.offset for one in found):
        parts["offset"] = PerAxis(**offset)
    return Size(**parts, varies=found[0].varies)


def _quantity(known: dict[Axis, Found], axis: Axis, kind: str) -> Quantity:
    one = known.get(axis) or next(iter(known.values()))
    return Quantity(float(getattr(one, kind)))

"""Where the file quotes how large an error is: every such number with its dotted place.

A place is the way to it through the file, with masks, pairs and features by id:
``tools.stepper.alignment``, ``masks.GATE.cd``, ``self_aligned.SD.edge``. One rule says when the kind
follows: in ``terms`` always, because a term may state several (``tools.stepper.terms.stage.random``);
elsewhere only when it is not the plain ``random`` (``masks.GATE.cd.bound``). A reading's own alignment
stands under its reference, ``masks.CONTACT.aligns_to.GATE.alignment``, and under its axis first where
it serves that axis alone, ``masks.CONTACT.aligns_to.x.GATE.alignment``. An alignment from mark sites
quotes what reading one mark costs, ``tools.stepper.alignment.per_mark``.

Offsets are known and signed, not sizes, and are left out. A number that is the same for x and y counts
as one that serves both, however it is written.
"""

import json
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from flowplan.model.base import AXES, Axis, PerAxis
from flowplan.model.flow import Flow, Layer
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Mask, Reading
from flowplan.model.terms import SHAPE_DIMENSION, Kind, Shape, SizeParts, Term
from flowplan.units import Quantity, convert

#: The way to a size: group, id, and the keys below it.
Keys = tuple[str, ...]
#: The step below an alignment from mark sites.
PER_MARK = "per_mark"
#: Steps of the way to a reading's alignment that serves one axis alone.
_ON_ONE_AXIS = 6


@dataclass(frozen=True, slots=True)
class Quoted:
    """One number of the file that says how large an error is.

    Attributes
    ----------
    keys : tuple of str
        The way to it, without the kind.
    kind : {'random', 'uniform', 'bound'}
        How the number is meant.
    axis : {'x', 'y'} or None
        The axis that it serves; None where one number serves both.
    size : Quantity
        The number as quoted.
    shape : str
        The term's shape; ``shift`` for everything that is not a term.
    """

    keys: Keys
    kind: Kind
    axis: Axis | None
    size: Quantity
    shape: Shape

    @property
    def path(self) -> str:
        """The dotted place; a step that holds a dot or a quote is put in quotes."""
        steps = self.keys
        if "terms" in self.keys[2:3] or self.kind != "random":
            steps = (*steps, self.kind)
        return ".".join(_step(step) for step in steps)

    @property
    def axes(self) -> tuple[Axis, ...]:
        """The axes that it serves."""
        return AXES if self.axis is None else (self.axis,)

    @property
    def is_length(self) -> bool:
        """Whether it is a length, rather than an angle or a ratio."""
        return SHAPE_DIMENSION[self.shape] == "length"

    def in_base(self, file_unit: str) -> float:
        """Return the size [nm, urad or ppm]."""
        return self.size.in_base(file_unit)

    def quantity(self, base: float, file_unit: str) -> Quantity:
        """Return another size of the same place as a quantity.

        Parameters
        ----------
        base : float
            The size [nm, urad or ppm].
        file_unit : str
            Unit of bare lengths in the file.
        """
        if self.is_length:
            return Quantity(convert(base, "nm", file_unit))
        return Quantity(base, "urad" if SHAPE_DIMENSION[self.shape] == "angle" else "ppm")


def _step(step: str) -> str:
    return json.dumps(step, ensure_ascii=False) if set(step) & {".", '"'} else step


def layer_keys(layer: Layer, name: str) -> Keys:
    """Return the way to a size of a mask or of a self-aligned feature."""
    return "masks" if isinstance(layer, Mask) else "self_aligned", layer.id, name


def term_keys(mask: Mask, tool: str | None, name: str) -> Keys:
    """Return the way to a term of a tool, or of a mask where `tool` is None."""
    return ("masks", mask.id, "terms", name) if tool is None else ("tools", tool, "terms", name)


def reading_keys(mask: Mask, reading: Reading, axis: Axis) -> Keys:
    """Return the way to a reading's own alignment; the axis is a step where it serves that one alone."""
    step = () if reading_axes(mask, reading, axis) == "xy" else (axis,)
    return "masks", mask.id, "aligns_to", *step, reading.mask, "alignment"


def reading_axes(mask: Mask, reading: Reading, axis: Axis) -> Literal["x", "y", "xy"]:
    """Return the axes that one reading serves: the one it stands under, or both with its twin."""
    other = mask.aligns_to.on("y" if axis == "x" else "x")
    both = any(r.mask == reading.mask and r.alignment == reading.alignment for r in other)
    return "xy" if both else axis


def quoted_sizes(flow: Flow) -> tuple[Quoted, ...]:
    """Return every quoted size of a flow, in file order: tools, masks, self-aligned features.

    Parameters
    ----------
    flow : Flow
        A checked flow.

    Returns
    -------
    tuple of Quoted
        Sizes of 0 too; no offsets.
    """
    return tuple(_Sizes(flow).everything())


def quoted_at(flow: Flow, path: str, axis: Axis | None = None) -> Quoted:
    """Return the size at a dotted place.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    path : str
        As `Quoted.path` writes it.
    axis : {'x', 'y'}, optional
        Which of the two numbers, where x and y differ.

    Raises
    ------
    KeyError
        When the flow quotes no such size.
    """
    for quoted in quoted_sizes(flow):
        if quoted.path == path and quoted.axis == axis:
            return quoted
    raise KeyError(path if axis is None else f"{path} ({axis})")


class _Sizes:
    def __init__(self, flow: Flow) -> None:
        self.flow = flow

    def everything(self) -> Iterator[Quoted]:
        for name, tool in self.flow.tools.items():
            for key in ("alignment", "wafer_alignment"):
                yield from self._parts(("tools", name, key), getattr(tool, key))
            for term_name, term in tool.terms.items():
                yield from self._parts(("tools", name, "terms", term_name), term)
        for mask in self.flow.masks:
            yield from self._readings(mask)
            for key in ("cd", "edge", "mark_reading"):
                yield from self._parts(layer_keys(mask, key), getattr(mask, key))
            for term_name, term in mask.terms.items():
                yield from self._parts(term_keys(mask, None, term_name), term)
        for feature in self.flow.self_aligned:
            yield from self._parts(layer_keys(feature, "edge"), feature.edge)

    def _readings(self, mask: Mask) -> Iterator[Quoted]:
        done: set[Keys] = set()
        for axis in AXES:
            for reading in mask.aligns_to.on(axis):
                keys = reading_keys(mask, reading, axis)
                if keys not in done:
                    done.add(keys)
                    only = axis if len(keys) == _ON_ONE_AXIS else None
                    yield from self._parts(keys, reading.alignment, only)

    def _parts(
        self, keys: Keys, size: SizeParts | MarkSites | None, only: Axis | None = None
    ) -> Iterator[Quoted]:
        if size is None:
            return
        if isinstance(size, MarkSites):
            # Readings along both axes bear on a fit of which one axis is used.
            yield from self._parts((*keys, PER_MARK), size.per_mark)
            return
        shape: Shape = size.shape if isinstance(size, Term) else "shift"
        for kind, per_axis in size.parts():
            if kind == "offset":
                continue
            for axis in (only,) if only else self._axes(per_axis):
                yield Quoted(keys, kind, axis, per_axis.on(axis or "x"), shape)

    def _axes(self, size: PerAxis) -> tuple[Axis | None, ...]:
        one = size.x.in_base(self.flow.unit) == size.y.in_base(self.flow.unit)
        return (None,) if one else AXES

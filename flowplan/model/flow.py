"""The flow: everything that one file says, complete with its defaults."""

from collections.abc import Iterator
from functools import cached_property
from typing import Annotated, Literal, Self

from pydantic import BeforeValidator, Field, PrivateAttr

from flowplan.errors import Path
from flowplan.model.base import (
    AXES,
    Described,
    Id,
    Model,
    NonNegativeLength,
    PositiveLength,
    Share,
    Sigmas,
    refuse,
)
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Mask, SelfAligned
from flowplan.model.pairs import Pair
from flowplan.model.terms import Shape, Term
from flowplan.model.tools import Tool
from flowplan.model.unitwords import unit_hint
from flowplan.model.variants import Variant
from flowplan.units import LENGTH_UNITS, Quantity, UnitError, canonical_unit

Basis = Literal["mixed", "rss", "linear"]
BASES: tuple[Basis, ...] = ("mixed", "rss", "linear")
Layer = Mask | SelfAligned


def _length_unit(value: object) -> object:
    if not isinstance(value, str):
        raise refuse("FP203", "a unit's name belongs here", "choose from " + ", ".join(LENGTH_UNITS))
    try:
        name = canonical_unit(value.strip())
    except UnitError as error:
        hint = unit_hint(error, value.strip())
        if hint == error.hint:
            hint = "choose from " + ", ".join(LENGTH_UNITS)
        raise refuse(error.code, error.message, hint) from None
    if name not in LENGTH_UNITS:
        raise refuse("FP402", f"{value} is not a length", "choose from " + ", ".join(LENGTH_UNITS))
    return name


FileUnit = Annotated[
    str,
    BeforeValidator(
        _length_unit,
        json_schema_input_type=Literal[
            "nm", "um", "\N{MICRO SIGN}m", "\N{GREEK SMALL LETTER MU}m", "mm", "cm", "in"
        ],
    ),
]


class Wafer(Model):
    """The wafer, centred on the origin."""

    diameter: PositiveLength = Field(description="Diameter.")
    edge_exclusion: NonNegativeLength = Field(
        default_factory=lambda: Quantity(0.0),
        description="Ring at the rim that is not used; 0 when left out.",
    )


class ExposureField(Model):
    """The exposure field; fields are stepped in a grid with one field centred on the wafer."""

    x: PositiveLength = Field(description="Width.")
    y: PositiveLength = Field(description="Height.")


class Flow(Described):
    """A wafer process as a sequence of masks, with the pairs of layers that must fit."""

    flow: Annotated[str, Field(min_length=1)] = Field(description="The flow's name.")
    revision: str = Field("", description="Revision of this file.")
    unit: FileUnit = Field("nm", description="Unit of every bare length in this file.")
    sigma: Sigmas = Field(3.0, description="Standard deviations at which random sizes are quoted.")
    confidence: Sigmas = Field(3.0, description="Standard deviations at which the verdict is taken.")
    basis: Basis = Field(
        "mixed", description="How bounds and random parts add up for the verdict: mixed, rss or linear."
    )
    reserve: Share = Field(0.0, description="A margin below this share of the drawn value is called tight.")
    wafer: Wafer | None = Field(None, description="The wafer; needed for shapes over the wafer.")
    field: ExposureField | None = Field(None, description="The exposure field; needed for shapes.")
    tools: dict[Id, Tool] = Field(default_factory=dict, description="Exposure tools by id.")
    masks: tuple[Mask, ...] = Field(description="The masks in process order.")
    self_aligned: tuple[SelfAligned, ...] = Field((), description="Features without an exposure.")
    split_layers: dict[Id, tuple[Id, ...]] = Field(
        default_factory=dict, description="Layers printed by several masks: id -> their ids."
    )
    pairs: tuple[Pair, ...] = Field((), description="Pairs of layers that must fit each other.")

    variants: tuple[Variant, ...] = Field(
        (), description="Other plans, each a partial flow laid over this one."
    )

    _variant: str | None = PrivateAttr(None)

    @property
    def variant(self) -> str | None:
        """Name of the variant that this flow is; None for the file's own plan."""
        return self._variant

    def as_variant(self, name: str) -> Self:
        """Return this flow under the name of a variant."""
        named = self.model_copy()
        named._variant = name
        return named

    @property
    def heading(self) -> str:
        """Name, revision and variant in one line."""
        revision = f", revision {self.revision}" if self.revision else ""
        return f"{self.flow}{revision}" + (f", variant {self.variant}" if self.variant else "")

    def __copy__(self) -> Self:
        """Copy without the cached views, which an update would make stale."""
        copied = super().__copy__()
        for name in ("layers", "shapes"):
            copied.__dict__.pop(name, None)
        return copied

    @cached_property
    def layers(self) -> dict[str, Layer]:
        """Masks and self-aligned features by id, each after everything it relies on."""
        found: dict[str, Layer] = {}
        waiting = list(self.self_aligned)
        for mask in self.masks:
            found[mask.id] = mask
            waiting = _settle(waiting, found)
        return found

    def expand(self, layer: str) -> tuple[str, ...]:
        """Return the layers that a name in a pair stands for."""
        return self.split_layers.get(layer, (layer,))

    def terms_of(self, mask: Mask) -> Iterator[tuple[str | None, str, Term]]:
        """Yield (tool id or None, term name, term) of everything that enters at a mask."""
        for name, term in self.tools[mask.tool].terms.items():
            yield mask.tool, name, term
        for name, term in mask.terms.items():
            yield None, name, term

    @cached_property
    def shapes(self) -> frozenset[Shape]:
        """Shapes other than `shift` that occur in the flow."""
        terms = [t for tool in self.tools.values() for t in tool.terms.values()]
        terms += [t for mask in self.masks for t in mask.terms.values()]
        fitted = (shape for _, sites in self.site_alignments() for shape in sites.shapes)
        return frozenset(t.shape for t in terms if t.shape != "shift").union(fitted)

    def site_alignments(self) -> Iterator[tuple[Path, MarkSites]]:
        """Yield every alignment from mark sites with its place; one for both axes comes once for each."""
        for name, tool in self.tools.items():
            if isinstance(tool.alignment, MarkSites):
                yield ("tools", name, "alignment"), tool.alignment
        for i, mask in enumerate(self.masks):
            for where, references in mask.every_reference():
                for axis in AXES:
                    for k, reading in enumerate(references.on(axis)):
                        if isinstance(reading.alignment, MarkSites):
                            yield ("masks", i, *where, axis, k, "alignment"), reading.alignment


def _settle(waiting: list[SelfAligned], found: dict[str, Layer]) -> list[SelfAligned]:
    """Move the features whose parents exist from `waiting` to `found`; return those left."""
    while True:
        ready = [f for f in waiting if f.follows.x in found and f.follows.y in found]
        if not ready:
            return waiting
        found.update((f.id, f) for f in ready)
        waiting = [f for f in waiting if f.id not in found]

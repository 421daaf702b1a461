"""Masks, what they align to, and features that a process step aligns by itself."""

from collections.abc import Iterator
from typing import Any, Literal

from pydantic import Field, GetJsonSchemaHandler, model_validator
from pydantic_core import CoreSchema

from flowplan.errors import Path
from flowplan.model.base import AXES, Axis, Described, Id, Model, PositiveNumber, one_or_more, refuse
from flowplan.model.marksites import Alignment
from flowplan.model.terms import Size, Term

WEIGHT_TOLERANCE = 1e-6


class Reading(Model):
    """One reference whose marks are read."""

    mask: Id = Field(description="A mask or self-aligned feature printed earlier, or `wafer`.")
    weight: PositiveNumber | None = Field(
        None, description="Share in an average; all equal when left out, together 1."
    )
    alignment: Alignment | None = Field(None, description="Replaces the tool's `alignment` for this reading.")

    @model_validator(mode="before")
    @classmethod
    def _from_id(cls, value: object) -> object:
        if isinstance(value, str):
            return {"mask": value}
        if not isinstance(value, dict | Reading):
            raise refuse("FP203", "a mask's id belongs here", "name an earlier mask, or wafer")
        return value

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return one_or_more(handler(schema), {"type": "string"})


class References(Model):
    """What a mask reads along x and along y: one reference each, or a weighted average."""

    x: tuple[Reading, ...] = Field(description="References read along x.")
    y: tuple[Reading, ...] = Field(description="References read along y.")

    @model_validator(mode="before")
    @classmethod
    def _both_axes(cls, value: object) -> object:
        if isinstance(value, References):
            return value
        if isinstance(value, dict) and not set(value) & {"mask", "weight", "alignment"}:
            return {k: _as_list(v) if k in AXES else v for k, v in value.items()}
        return {"x": _as_list(value), "y": _as_list(value)}

    @model_validator(mode="after")
    def _weights_add_up(self) -> "References":
        for axis in AXES:
            _check_weights(self.on(axis))
        return self

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        full = handler(schema)
        several = full["properties"]["x"]
        one = several["items"]
        either = {"anyOf": [one, {"type": "array", "items": one, "minItems": 1}]}
        per_axis = full | {
            "properties": {axis: either | {"description": f"What is read along {axis}."} for axis in AXES}
        }
        return one_or_more(per_axis, *either["anyOf"])

    def on(self, axis: Axis) -> tuple[Reading, ...]:
        """Return the readings along one axis."""
        return self.x if axis == "x" else self.y

    def weighted(self, axis: Axis) -> tuple[tuple[Reading, float], ...]:
        """Return the readings along one axis, each with its weight; the weights add up to 1."""
        readings = self.on(axis)
        raw = [1.0 if r.weight is None else r.weight for r in readings]
        total = sum(raw)
        return tuple((r, w / total) for r, w in zip(readings, raw, strict=True))


def _as_list(value: object) -> object:
    return value if isinstance(value, list | tuple) else [value]


def _check_weights(readings: tuple[Reading, ...]) -> None:
    if not readings:
        raise refuse("FP205", "no reference is named", "name an earlier mask, or wafer")
    names = [r.mask for r in readings]
    for name in names:
        if names.count(name) > 1:
            raise refuse("FP302", f"{name!r} stands twice in one average", "name each reference once")
    given = [r.weight for r in readings if r.weight is not None]
    if given and len(given) < len(readings):
        raise refuse("FP304", "some references have a weight and some do not", "give all or none")
    if given and abs(sum(given) - 1) > WEIGHT_TOLERANCE:
        raise refuse("FP304", f"the weights add up to {sum(given):.6g}, not 1", "change them to add up to 1")


class Mask(Described):
    """One exposure: a mask, its tool, what it aligns to and the errors of its own."""

    id: Id = Field(description="The name used by everything that refers to this mask.")
    tool: Id = Field(description="The tool that exposes it, a key of `tools`.")
    aligns_to: References = Field(description="Earlier masks whose marks are read, or `wafer`.")
    may_align_to: tuple[References, ...] | None = Field(
        None,
        min_length=1,
        description="Other references that `propose` may choose, each in a form of `aligns_to`.",
    )
    cd: Size | None = Field(
        None, description="Variation of the full width (critical dimension); each edge moves by half."
    )
    edge: Size | None = Field(
        None, description="Variation of one edge, positive when the feature grows; instead of `cd`."
    )
    mark_reading: Size | None = Field(
        None, description="Extra error, fresh each time somebody reads this mask's marks."
    )
    terms: dict[str, Term] = Field(default_factory=dict, description="Named error terms of this mask alone.")
    side: Literal["front", "back"] = Field(
        "front", description="`back`: exposed on the turned-over wafer, x reversed (SEMI M20)."
    )

    def every_reference(self) -> Iterator[tuple[Path, References]]:
        """Yield what the mask reads and what it may read, each with its place in the mask."""
        yield ("aligns_to",), self.aligns_to
        for k, candidate in enumerate(self.may_align_to or ()):
            yield ("may_align_to", k), candidate

    @model_validator(mode="after")
    def _one_edge(self) -> "Mask":
        if self.cd is not None and self.edge is not None:
            hint = "keep one; cd is full width, edge one side"
            raise refuse("FP208", "both cd and edge are given", hint, key="edge")
        return self


class Follows(Model):
    """Which layer's pattern a self-aligned feature takes over, per axis."""

    x: Id = Field(description="The layer followed along x.")
    y: Id = Field(description="The layer followed along y.")

    @model_validator(mode="before")
    @classmethod
    def _both_axes(cls, value: object) -> object:
        return {"x": value, "y": value} if isinstance(value, str) else value

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return one_or_more(handler(schema), {"type": "string"})

    def on(self, axis: Axis) -> str:
        """Return the layer followed along one axis."""
        return self.x if axis == "x" else self.y


Tone = Literal["same", "opposite"]


class Tones(Model):
    """Whether the parent's edge errors come over with the same or the opposite sign, per axis."""

    x: Tone = Field("same", description="Along x.")
    y: Tone = Field("same", description="Along y.")

    @model_validator(mode="before")
    @classmethod
    def _both_axes(cls, value: object) -> object:
        return value if isinstance(value, dict | Tones) else {"x": value, "y": value}

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return one_or_more(handler(schema), {"enum": ["same", "opposite"]})

    def sign(self, axis: Axis) -> int:
        """Return +1 for `same`, -1 for `opposite`."""
        return 1 if (self.x if axis == "x" else self.y) == "same" else -1


class SelfAligned(Described):
    """A feature whose place comes from another layer's pattern, without an exposure of its own."""

    id: Id = Field(description="The name used by pairs and by masks that read its marks.")
    follows: Follows = Field(description="The layer whose pattern position it has, exactly.")
    tone: Tones = Field(
        default_factory=Tones, validate_default=True, description="Sign of the inherited edge errors."
    )
    edge: Size | None = Field(None, description="Its own error per edge, positive when the feature grows.")

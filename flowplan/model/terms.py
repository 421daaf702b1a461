"""Error terms: how large, of which kind, where they enter and which shape they have."""

from typing import Any, Literal

from pydantic import Field, GetJsonSchemaHandler, model_validator
from pydantic_core import CoreSchema

from flowplan.model.base import (
    AXES,
    QUANTITY_SCHEMA,
    Axis,
    Described,
    Id,
    Model,
    PerAxis,
    Share,
    not_negative,
    one_or_more,
    refuse,
    require_dimension,
)
from flowplan.units import Dimension, Quantity

Kind = Literal["random", "uniform", "bound", "offset"]
KINDS: tuple[Kind, ...] = ("random", "uniform", "bound", "offset")
Shape = Literal["shift", "rotation", "magnification", "scale", "skew"]
Enters = Literal["layer", "pattern", "marks"]
#: How often an error is redrawn, the rarest first.
Level = Literal["mask", "lot", "wafer", "field"]
LEVELS: tuple[Level, ...] = ("mask", "lot", "wafer", "field")

#: What a shape is measured in, and whether each axis has a scalar of its own.
SHAPE_DIMENSION: dict[Shape, Dimension] = {
    "shift": "length",
    "rotation": "angle",
    "magnification": "ratio",
    "scale": "ratio",
    "skew": "angle",
}
SHAPE_PER_AXIS: frozenset[Shape] = frozenset({"shift", "scale"})
#: What a scalar of each shape does along x and along y at (x, y): (which of 1, x, y; sign), None for nothing.
#: rotation (-th*y, th*x); magnification (m*x, m*y); scale (sx*x, sy*y); skew (-phi*y, 0).
SHAPE_ACTION: dict[Shape, dict[Axis, tuple[int, int] | None]] = {
    "shift": {"x": (0, 1), "y": (0, 1)},
    "rotation": {"x": (2, -1), "y": (1, 1)},
    "magnification": {"x": (1, 1), "y": (2, 1)},
    "scale": {"x": (1, 1), "y": (2, 1)},
    "skew": {"x": (2, -1), "y": None},
}


class SizeParts(Model):
    """The four ways to state how large an error is; at least one is given."""

    random: PerAxis | None = Field(
        None, description="Normal, quoted at the flow's `sigma` standard deviations."
    )
    uniform: PerAxis | None = Field(None, description="Evenly spread over ± this half-width.")
    bound: PerAxis | None = Field(
        None, description="At most this in size, sign unknown, the same on every wafer."
    )
    offset: PerAxis | None = Field(None, description="Known and signed.")
    varies: Level | None = Field(
        None,
        description="How often it is redrawn: once for the `mask` set, once a `lot`, a `wafer` or a `field`; "
        "a margin does not depend on it, yield by field and wafer does.",
    )

    @model_validator(mode="before")
    @classmethod
    def _bare_is_random(cls, value: object) -> object:
        if isinstance(value, dict):
            keys = set(value)
            return {"random": value} if keys and keys <= {"x", "y"} else value
        if isinstance(value, SizeParts):
            return value
        return {"random": value}

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        per_axis = {
            "type": "object",
            "properties": {a: QUANTITY_SCHEMA | {"description": f"Random, along {a}."} for a in AXES},
            "required": list(AXES),
            "additionalProperties": False,
        }
        return one_or_more(handler(schema), QUANTITY_SCHEMA, per_axis)

    def parts(self) -> tuple[tuple[Kind, PerAxis], ...]:
        """Return the given kinds with their sizes, in the order of `KINDS`."""
        found = ((kind, getattr(self, kind)) for kind in KINDS)
        return tuple((kind, size) for kind, size in found if size is not None)

    def _check_parts(self, dimension: Dimension, what: str) -> None:
        parts = self.parts()
        if not parts:
            raise refuse("FP202", "no size is given", "give one of " + ", ".join(KINDS))
        for kind, size in parts:
            for axis in AXES:
                require_dimension(size.on(axis), dimension, what, kind)
                if kind != "offset":
                    not_negative(size.on(axis), kind)


class Size(SizeParts):
    """The size of an error that is a length on the wafer; a bare number is `random`."""

    @model_validator(mode="after")
    def _lengths(self) -> "Size":
        self._check_parts("length", "a length")
        return self


class Term(SizeParts, Described):
    """One error of a tool or a mask; a bare number means `{random: number}`."""

    enters: Enters = Field(
        "layer",
        description="`layer` moves pattern and marks, `pattern` only the device pattern, "
        "`marks` only the marks as later masks read them.",
    )
    shape: Shape = Field("shift", description="How the error varies over field or wafer.")
    over: Literal["field", "wafer"] = Field(
        "field", description="Whether the shape is centred on each field or on the wafer."
    )
    source: Id | None = Field(None, description="Terms that name the same source are one physical error.")
    common: Share | None = Field(
        None, description="Share of the variance (0 to 1) that is common; 1 when `source` is given."
    )

    @property
    def common_share(self) -> float:
        """The share that is common, with its default filled in."""
        if self.common is not None:
            return self.common
        return 1.0 if self.source is not None else 0.0

    @model_validator(mode="after")
    def _fits_shape(self) -> "Term":
        dimension = SHAPE_DIMENSION[self.shape]
        wanted = {"length": "a length", "angle": "an angle", "ratio": "a ratio"}[dimension]
        self._check_parts(dimension, f"for shape {self.shape} {wanted}")
        if self.shape not in SHAPE_PER_AXIS:
            for kind, size in self.parts():
                if size.x != size.y:
                    raise refuse(
                        "FP405",
                        f"{kind}: a {self.shape} is one number for both axes",
                        "give a single value, or use shape: scale for a factor on each axis",
                        key=kind,
                    )
        return self


def quoted(size: PerAxis, axis: Literal["x", "y"] | None) -> Quantity:
    """Return the size for one axis, or the single size that serves both (`axis` None)."""
    return size.on(axis or "x")

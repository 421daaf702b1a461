"""What every part of the flow file shares: strict frozen models, quantities and per-axis values."""

import copy
import math
from collections.abc import Callable
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    model_validator,
)
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from flowplan.model.unitwords import unit_hint
from flowplan.units import UNITS, Dimension, Quantity, UnitError, parse_quantity

Axis = Literal["x", "y"]
AXES: tuple[Axis, Axis] = ("x", "y")

_MICRO_SPELLINGS = [
    f"{sign}{base}" for sign in ("\N{MICRO SIGN}", "\N{GREEK SMALL LETTER MU}") for base in ("m", "rad")
]

QUANTITY_SCHEMA: dict[str, Any] = {
    "anyOf": [
        {"type": "number"},
        {
            "type": "string",
            "pattern": r"^\s*[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?\s*("
            + "|".join([*UNITS, *_MICRO_SPELLINGS])
            + r")?\s*$",
        },
    ]
}


#: No length, angle or ratio of a wafer process comes near this, in whatever unit it is written.
LARGEST = 1e12


def refuse(code: str, message: str, hint: str = "", *, key: str = "") -> PydanticCustomError:
    """Return the error that a validator raises, with a diagnostic code, a hint and the key to point at."""
    return PydanticCustomError(code, "{message}", {"message": message, "hint": hint, "key": key})


class Model(BaseModel):
    """Base of all parts: frozen, unknown keys refused."""

    model_config = ConfigDict(extra="forbid", frozen=True, use_attribute_docstrings=False)


class Described(Model):
    """A part that may carry free text, shown in the report."""

    title: str = Field("", description="A short name for people.")
    notes: str = Field("", description="Free text, shown in the report.")
    owner: str = Field("", description="Who answers for these figures.")
    why: str = Field("", description="Why it is done this way.")


def read_quantity(value: object) -> Quantity:
    """Read a number or a text with a unit; the border between plain data and `Quantity`."""
    if isinstance(value, Quantity):
        quantity = value
    elif isinstance(value, str):
        try:
            quantity = parse_quantity(value)
        except UnitError as error:
            unit = value.strip().lstrip("+-0123456789.eE").strip()
            hint = unit_hint(error, unit) if error.code == "FP401" else error.hint
            raise refuse(error.code, error.message, hint) from None
    elif isinstance(value, int | float) and not isinstance(value, bool):
        quantity = Quantity(_as_float(value))
    else:
        raise refuse("FP203", "a number or a text with a unit belongs here", 'for example 120 or "0.12 um"')
    if not math.isfinite(quantity.value):
        raise refuse("FP207", "the number is not finite", "write an ordinary number")
    if abs(quantity.value) > LARGEST:
        raise refuse("FP206", f"{quantity} is far too large", "check the number and its unit")
    return quantity


def _as_float(value: float) -> float:
    """Convert to a float; a whole number beyond its range is infinite."""
    try:
        return float(value)
    except OverflowError:
        return math.inf


class _QuantityAnnotation:
    """Teaches pydantic to read a `Quantity` and to describe it in the JSON Schema."""

    @classmethod
    def __get_pydantic_core_schema__(cls, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(
            read_quantity, serialization=core_schema.plain_serializer_function_ser_schema(_written)
        )

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return copy.deepcopy(QUANTITY_SCHEMA)  # pydantic adds each field's own default to it


def _written(quantity: Quantity) -> float | str:
    return quantity.value if quantity.unit is None else str(quantity)


AnyQuantity = Annotated[Quantity, _QuantityAnnotation]


def require_dimension(
    quantity: Quantity, dimension: Dimension, what: str = "a length", key: str = ""
) -> Quantity:
    """Return the quantity, or refuse its unit, pointing at a key of what holds it.

    Raises
    ------
    PydanticCustomError
        FP402, naming the units that fit.
    """
    if quantity.dimension != dimension:
        fitting = ", ".join(name for name, (d, _) in UNITS.items() if d == dimension)
        given = quantity.unit or "a bare number (a length)"
        raise refuse(
            "FP402", f"{what} is wanted, {given} does not fit", f"units that fit: {fitting}", key=key
        )
    return quantity


def _length(quantity: Quantity) -> Quantity:
    return require_dimension(quantity, "length")


def not_negative(quantity: Quantity, key: str = "") -> Quantity:
    """Return the quantity, or refuse a negative one (FP206), pointing at a key of what holds it."""
    if quantity.value < 0:
        hint = "a size is 0 or more; only offsets have a sign"
        raise refuse("FP206", f"{quantity} is negative", hint, key=key)
    return quantity


def _positive(quantity: Quantity) -> Quantity:
    if quantity.value <= 0:
        raise refuse("FP206", f"{quantity} is not above 0", "give a size above 0")
    return quantity


Length = Annotated[AnyQuantity, AfterValidator(_length)]
PositiveLength = Annotated[Length, AfterValidator(_positive)]
NonNegativeLength = Annotated[Length, AfterValidator(lambda quantity: not_negative(quantity))]


class PerAxis(Model):
    """One value for x and one for y; a single value in the file stands for both."""

    x: AnyQuantity = Field(description="The value along x.")
    y: AnyQuantity = Field(description="The value along y.")

    @model_validator(mode="before")
    @classmethod
    def _both_from_one(cls, value: object) -> object:
        if isinstance(value, dict | PerAxis):
            return value
        return {"x": value, "y": value}

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        return one_or_more(handler(schema), QUANTITY_SCHEMA)

    def on(self, axis: Axis) -> Quantity:
        """Return the value along one axis."""
        return self.x if axis == "x" else self.y

    def __str__(self) -> str:
        return str(self.x) if self.x == self.y else f"x {self.x}, y {self.y}"

    def each(self, rule: Callable[[Quantity], Quantity]) -> "PerAxis":
        """Apply a rule that returns or refuses to both values."""
        rule(self.x)
        rule(self.y)
        return self


def one_or_more(full: dict[str, Any], *others: dict[str, Any]) -> dict[str, Any]:
    """Return a JSON Schema that accepts the full form or one of the shorthands."""
    return {"anyOf": [*others, full]}


def _lengths(value: PerAxis) -> PerAxis:
    return value.each(_length)


def _not_negatives(value: PerAxis) -> PerAxis:
    return value.each(not_negative)


Lengths = Annotated[PerAxis, AfterValidator(_lengths)]
NonNegativeLengths = Annotated[Lengths, AfterValidator(_not_negatives)]


def _read_share(value: object) -> object:
    """Read ``0.8`` or ``80 %``."""
    if isinstance(value, str) and value.strip().endswith("%"):
        try:
            number = float(value.strip()[:-1]) / 100
        except ValueError:
            raise refuse("FP203", f"{value!r} is not a share", "write 0.8 or 80 %") from None
    elif isinstance(value, int | float) and not isinstance(value, bool):
        number = _as_float(value)
    else:
        raise refuse("FP203", "a share belongs here", "write 0.8 or 80 %")
    if not math.isfinite(number):
        raise refuse("FP207", "the number is not finite", "write 0.8 or 80 %")
    if not 0 <= number <= 1:
        raise refuse("FP206", f"{value} is not between 0 and 1", "write 0.1 or 10 % for a tenth")
    return number


Share = Annotated[
    float,
    BeforeValidator(
        _read_share,
        json_schema_input_type=Annotated[float, Field(ge=0, le=1)]
        | Annotated[str, Field(pattern=r"^\s*\+?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?\s*%\s*$")],
    ),
]


def _finite_positive(value: object) -> object:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise refuse("FP203", "a plain number belongs here", "for example 3")
    number = _as_float(value)
    if not math.isfinite(number):
        raise refuse("FP207", "the number is not finite", "write an ordinary number")
    if number <= 0:
        raise refuse("FP206", f"{value} is not above 0", "give a number above 0")
    return number


PositiveNumber = Annotated[
    float,
    BeforeValidator(_finite_positive, json_schema_input_type=Annotated[float, Field(gt=0)]),
]


LEAST_SIGMAS, MOST_SIGMAS = 0.01, 100.0


def _ordinary(number: float) -> float:
    if not LEAST_SIGMAS <= number <= MOST_SIGMAS:
        message = f"{number:g} is no usual number of standard deviations"
        raise refuse("FP206", message, f"between {LEAST_SIGMAS:g} and {MOST_SIGMAS:g}, mostly 1 or 3")
    return number


Sigmas = Annotated[PositiveNumber, AfterValidator(_ordinary)]


def _read_id(value: object) -> str:
    if not isinstance(value, str):
        raise refuse("FP203", "an id is a text", 'put it in quotes, for example "M1"')
    if not value or value != value.strip() or not value.isprintable():
        raise refuse("FP203", f"{value!r} cannot be an id", "use letters and digits, such as METAL1")
    return value


Id = Annotated[str, BeforeValidator(_read_id, json_schema_input_type=str)]

#: The name that stands for the wafer's own frame, before any mark is printed.
WAFER = "wafer"

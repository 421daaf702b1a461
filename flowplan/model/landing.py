"""The rule `landing`: how much of a contact or via lands on its pad, and what that does to its resistance."""

import math
import re
from typing import Annotated, Literal

from pydantic import AfterValidator, BeforeValidator, Field, model_validator

from flowplan.model.base import (
    LARGEST,
    Axis,
    Described,
    Id,
    Model,
    PositiveLength,
    PositiveNumber,
    Share,
    refuse,
)
from flowplan.units import convert

#: The two tails of 3 standard deviations, rounded [ppm].
TWO_TAILS_PPM = 2700.0
_MILLION = 1e6

_AREA_UNITS = {"um2": 1.0, "cm2": 1e8}
_NUMBER = r"\+?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?"
_UNIT = r"ohm[ *.·]?(?P<area>um2|cm2)"
_RESISTIVITY = re.compile(rf"\s*(?P<number>{_NUMBER})\s*{_UNIT}\s*")
_SPELLINGS = (("µ", "u"), ("μ", "u"), ("²", "2"), ("^2", "2"), ("Ω", "ohm"))
_ONE_OF_TWO = 'give `nominal: 8` or `resistivity: "20 ohm um2"`'
_RESISTIVITY_HINT = 'write 20 or "20 ohm um2"; "2e-7 ohm cm2" is known too'


def _read_resistivity(value: object) -> float:
    """Read a specific contact resistivity [ohm um^2]."""
    if isinstance(value, str):
        plain = value
        for spelling, known in _SPELLINGS:
            plain = plain.replace(spelling, known)
        found = _RESISTIVITY.fullmatch(plain)
        if not found:
            raise refuse("FP401", f"{value!r} is not a specific contact resistivity", _RESISTIVITY_HINT)
        number = float(found["number"]) * _AREA_UNITS[found["area"]]
    elif isinstance(value, int | float) and not isinstance(value, bool):
        number = float(value) if abs(value) < LARGEST else math.inf
    else:
        raise refuse("FP203", "a specific contact resistivity belongs here", _RESISTIVITY_HINT)
    if not math.isfinite(number):
        raise refuse("FP207", "the number is not finite", "write an ordinary number")
    if number <= 0:
        raise refuse("FP206", f"{value} is not above 0", "give a resistivity above 0")
    return number


Resistivity = Annotated[
    float,
    BeforeValidator(
        _read_resistivity,
        json_schema_input_type=Annotated[float, Field(gt=0)]
        | Annotated[str, Field(pattern=rf"^\s*{_NUMBER}\s*(ohm|Ω|Ω)[ *.·]?[uµμc]m(2|²|\^2)\s*$")],
    ),
]


_OF_OTHER_RULES = {
    "axes": "leave it out: the landed area takes x and y together",
    "drawn": "give the sizes of `contact` and `pad`",
    "keep": "give `least_area`, the share of the contact that must land",
    "limit": "give `least_area`, or `resistance: {nominal: 8, limit: 12}`",
}


def _parts_per_million(value: float) -> float:
    if value > _MILLION:
        raise refuse("FP206", f"{value:g} ppm is more than all", "give at most 1000000")
    return value


class Rectangle(Model):
    """A layer's rectangle with its drawn full widths."""

    layer: Id = Field(description="The layer that prints it.")
    x: PositiveLength = Field(description="Drawn full width along x.")
    y: PositiveLength = Field(description="Drawn full width along y.")


class Resistance(Model):
    """What a contact's resistance is when all of it lands, and what it may grow to."""

    nominal: PositiveNumber | None = Field(
        None, description="Resistance of the drawn contact, wholly landed [ohm]."
    )
    resistivity: Resistivity | None = Field(
        None, description="Instead of it: specific contact resistivity [ohm um2]; divided by the drawn area."
    )
    limit: PositiveNumber | None = Field(None, description="Largest allowed resistance [ohm].")

    @model_validator(mode="after")
    def _one_way(self) -> "Resistance":
        if self.nominal is None and self.resistivity is None:
            raise refuse("FP202", "the resistance itself is not given", _ONE_OF_TWO)
        if self.nominal is not None and self.resistivity is not None:
            message = "`nominal` and `resistivity` exclude each other"
            raise refuse("FP208", message, _ONE_OF_TWO, key="resistivity")
        return self


class Landing(Described):
    """A contact or via lands on a pad; judged by the area that lands and by the resistance."""

    rule: Literal["landing"] = Field(description="How the two layers must fit.")
    name: str = Field("", description="Name of the pair; made from its layers when left out.")
    contact: Rectangle = Field(description="The contact or via.")
    pad: Rectangle = Field(description="What it lands on; may be smaller than the contact.")
    least_area: Share | None = Field(
        None, description="Least share of the drawn contact area that must land."
    )
    resistance: Resistance | None = Field(None, description="The contact's resistance and its limit.")
    allowed_ppm: Annotated[PositiveNumber, AfterValidator(_parts_per_million)] = Field(
        TWO_TAILS_PPM, description="How many contacts in a million may miss what is asked."
    )

    @model_validator(mode="before")
    @classmethod
    def _both_axes_at_once(cls, value: object) -> object:
        for key, instead in _OF_OTHER_RULES.items():
            if isinstance(value, dict) and key in value:
                raise refuse("FP201", f"`{key}` does not belong to a landing pair", instead, key=key)
        return value

    @property
    def layers(self) -> tuple[str, str]:
        """Pad, contact: the overlay is that of the second against the first."""
        return self.pad.layer, self.contact.layer

    @property
    def judged_axes(self) -> tuple[Axis, ...]:
        """No axis alone: the two together."""
        return ()

    def nominal_resistance(self, unit: str) -> float | None:
        """Return the resistance of the drawn contact, wholly landed [ohm].

        Parameters
        ----------
        unit : str
            The file's unit.

        Notes
        -----
        R = rho / A with the specific contact resistivity rho and the drawn area A.
        """
        given = self.resistance
        if given is None or given.resistivity is None:
            return None if given is None else given.nominal
        width, height = (
            convert(length.in_base(unit), "nm", "um") for length in (self.contact.x, self.contact.y)
        )
        return given.resistivity / (width * height)

    def least_fraction(self, unit: str) -> float | None:
        """Return the share of the drawn area below which the pair fails; None where nothing is judged.

        Parameters
        ----------
        unit : str
            The file's unit.

        Notes
        -----
        R > limit says the same as A / A0 < nominal / limit, so the larger of the two shares counts.
        """
        nominal, asked = self.nominal_resistance(unit), self.resistance
        shares = [] if self.least_area is None else [self.least_area]
        if nominal is not None and asked is not None and asked.limit is not None:
            shares.append(nominal / asked.limit)
        return max(shares, default=None)

"""Units of the flow file: one closed list, one place of conversion.

Inside flowplan lengths are nm, positions on wafer and field mm, angles urad, ratios ppm.
With these, 1 urad or 1 ppm over 1 mm is exactly 1 nm, so no factor stands in the arithmetic.
"""

import math
import re
from dataclasses import dataclass
from typing import Literal

Dimension = Literal["length", "angle", "ratio", "temperature"]

#: Unit name -> (dimension, how many base units one of it is). Bases: nm, urad, ppm, K.
UNITS: dict[str, tuple[Dimension, float]] = {
    "nm": ("length", 1.0),
    "um": ("length", 1e3),
    "mm": ("length", 1e6),
    "cm": ("length", 1e7),
    "in": ("length", 25.4e6),
    "urad": ("angle", 1.0),
    "mrad": ("angle", 1e3),
    "ppm": ("ratio", 1.0),
    "ppb": ("ratio", 1e-3),
    "degC": ("temperature", 1.0),
    "K": ("temperature", 1.0),
}

LENGTH_UNITS = tuple(name for name, (dimension, _) in UNITS.items() if dimension == "length")

_MICRO = str.maketrans({"\N{MICRO SIGN}": "u", "\N{GREEK SMALL LETTER MU}": "u"})
_NUMBER_AND_UNIT = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([^\s\d.,]\S*)?")


class UnitError(ValueError):
    """A text that is not a number with a known unit.

    Attributes
    ----------
    code : str
        The diagnostic code, see `flowplan.errors.CODES`.
    message, hint : str
        What is wrong, and what to write instead.
    """

    def __init__(self, code: str, message: str, hint: str) -> None:
        super().__init__(message)
        self.code = code
        self.message = message
        self.hint = hint


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number as the file quotes it, with its unit if one is written.

    Attributes
    ----------
    value : float
        The number as written.
    unit : str or None
        A key of `UNITS`; None for a bare number, which means the file's length unit.
    """

    value: float
    unit: str | None = None

    @property
    def dimension(self) -> Dimension:
        """What is measured; a bare number is a length."""
        return "length" if self.unit is None else UNITS[self.unit][0]

    def in_base(self, file_unit: str) -> float:
        """Return the value in the base unit of its dimension.

        Parameters
        ----------
        file_unit : str
            The length unit that a bare number stands for.

        Returns
        -------
        float
            [nm], [urad], [ppm] or [K].
        """
        return convert(self.value, self.unit or file_unit, "")

    def __str__(self) -> str:
        return f"{self.value:.12g}" + (f" {self.unit}" if self.unit else "")


def canonical_unit(text: str) -> str:
    """Return the unit's plain spelling, the micro sign written as ``u``.

    Raises
    ------
    UnitError
        FP401, when the unit is not in the closed list.
    """
    name = text.translate(_MICRO)
    if name not in UNITS:
        raise UnitError("FP401", f"unknown unit {text!r}", "known units: " + ", ".join(UNITS))
    return name


def parse_quantity(text: str) -> Quantity:
    """Read text such as ``0.12 um`` or ``-3 ppm``.

    Parameters
    ----------
    text : str
        A number, then a unit from the closed list; a number alone is taken as bare.

    Returns
    -------
    Quantity
        The number and its unit.

    Raises
    ------
    UnitError
        FP203 when there is no number, FP401 when the unit is unknown.
    """
    match = _NUMBER_AND_UNIT.fullmatch(text.strip())
    if match is None:
        raise UnitError(
            "FP203",
            f"{text!r} is not a number with a unit",
            'write for example 120 or "0.12 um", with a point for decimals',
        )
    number, unit = match.groups()
    return Quantity(float(number), canonical_unit(unit) if unit else None)


def convert(value: float, unit: str, to: str) -> float:
    """Convert between two units of one dimension.

    Parameters
    ----------
    value : float
        Value in `unit`.
    unit, to : str
        Keys of `UNITS`; an empty `to` means the base unit of the dimension.

    Returns
    -------
    float
        Value in `to`. Dividing by a whole factor keeps decimal figures decimal
        (0.12 um -> 120 nm -> 0.12 um).

    Raises
    ------
    ValueError
        When the dimensions differ.
    """
    dimension, factor = UNITS[unit]
    if to:
        other, to_factor = UNITS[to]
        if other != dimension:
            msg = f"{unit} is a {dimension}, {to} a {other}"
            raise ValueError(msg)
        factor /= to_factor
    return value * factor if factor >= 1 else value / (1 / factor)


def significant(value: float, digits: int = 12) -> float:
    """Round to significant digits, so that unit conversion leaves no binary dust.

    Parameters
    ----------
    value : float
        Any float; infinities and NaN pass through.
    digits : int
        Significant digits kept.

    Returns
    -------
    float
        The rounded value; never -0.
    """
    if value == 0 or not math.isfinite(value):
        return value if value else 0.0
    return float(f"{value:.{digits}g}")

"""What people write for a unit, and which unit of the closed list they mean."""

from flowplan.errors import nearest
from flowplan.units import UNITS, UnitError

_MEANT = {
    "micron": "um", "microns": "um", "micrometer": "um", "micrometre": "um", "mu": "um", "u": "um",
    "\N{MICRO SIGN}": "um", "\N{GREEK SMALL LETTER MU}": "um",
    "nanometer": "nm", "nanometre": "nm", "n": "nm",
    "millimeter": "mm", "millimetre": "mm", "centimeter": "cm", "centimetre": "cm",
    "inch": "in", "inches": "in", '"': "in", "microrad": "urad", "microradian": "urad",
    "kelvin": "K", "\N{DEGREE SIGN}c": "degC", "c": "degC",
}  # fmt: skip
_WORTH = {
    "\N{LATIN CAPITAL LETTER A WITH RING ABOVE}": "0.1 nm", "\N{ANGSTROM SIGN}": "0.1 nm", "a": "0.1 nm",
    "angstrom": "0.1 nm", "pm": "0.001 nm", "m": "1000 mm", "mil": "0.001 in", "rad": "1000 mrad",
    "nrad": "0.001 urad",
}  # fmt: skip


def unit_hint(error: UnitError, unit: str) -> str:
    """Return what to write instead of an unknown unit.

    Parameters
    ----------
    error : UnitError
        FP401; its hint lists the known units.
    unit : str
        What was written.

    Returns
    -------
    str
        The unit that is meant, what an unlisted unit is worth in a listed one, or the known units.
    """
    worth = _WORTH.get(unit) or _WORTH.get(unit.casefold())
    if worth:
        return f"1 {unit} is {worth}"
    meant = _MEANT.get(unit.casefold())
    if meant:
        return f"did you mean {meant!r}?"
    near = nearest(unit, list(UNITS))
    return near if near.startswith("did you mean") else error.hint

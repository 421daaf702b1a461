"""``flowplan levers --format json``: what each quoted size is worth, in the file's units."""

from typing import Any

from flowplan.engine.levers import Gain, Lever, Levers
from flowplan.model.paths import Quoted
from flowplan.report.records import finite, in_unit
from flowplan.units import convert

Record = dict[str, Any]


def levers_document(found: Levers) -> Record:
    """Return levers as one JSON-ready document.

    Parameters
    ----------
    found : Levers
        What `levers` returns.

    Returns
    -------
    dict
        Lengths in the file's unit; the `value` and `largest_passing` of an angle or a ratio in urad or
        ppm, its `derivative` in the file's unit per urad or ppm; `unit` says which. `largest_passing`
        is null where no value of the size alone makes every pair pass, and where every value does:
        then `unlimited` is true.
    """
    unit = found.flow.unit
    return {
        "worst": in_unit(found.worst, unit),
        "failing": found.failing,
        "levers": [lever_record(lever, unit) for lever in found.levers],
    }


def lever_record(lever: Lever, unit: str) -> Record:
    """Return one lever as a JSON-ready record."""
    quoted = lever.quoted
    derivative = lever.derivative if quoted.is_length else convert(lever.derivative, "nm", unit)
    return {
        "path": quoted.path,
        "axis": quoted.axis,
        "value": in_own_unit(quoted, lever.value, unit),
        "gain_if_halved": _gain(lever.halved, unit),
        "gain_if_removed": _gain(lever.removed, unit),
        "derivative": finite(derivative),
        "dominates": lever.dominates,
        "largest_passing": in_own_unit(quoted, lever.largest, unit),
        "unlimited": lever.is_unlimited,
        "unit": own_unit(quoted, unit),
    }


def own_unit(quoted: Quoted, unit: str) -> str:
    """Return the unit in which a size is told: the file's for a length, else urad or ppm."""
    return quoted.quantity(0.0, unit).unit or unit


def in_own_unit(quoted: Quoted, size: float | None, unit: str) -> float | None:
    """Return a size [nm, urad or ppm] in its own unit; None for none or infinite."""
    return in_unit(size, unit) if quoted.is_length else finite(size)


def _gain(gain: Gain, unit: str) -> Record:
    return {"worst": in_unit(gain.worst, unit), "failing": gain.failing}

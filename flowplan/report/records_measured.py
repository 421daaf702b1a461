"""Measured overlay as plain records in the file's unit."""

from typing import Any

from flowplan.engine.measured.nested import LEVELS, Split
from flowplan.engine.measured.sizes import Found
from flowplan.engine.measured.summary import AxisFigures, MeasuredReading
from flowplan.model.base import AXES
from flowplan.report.measuring import Taken
from flowplan.report.records import Record, finite, in_unit
from flowplan.units import convert

_SHIFTS = ("shift_x", "shift_y")


def measured_document(taken: Taken) -> Record:
    """Return what ``flowplan measured --format json`` prints.

    Returns
    -------
    dict
        Lengths in the flow's unit, variances in its square, ratios in ppm, angles in urad; null for what
        the data cannot tell. An estimated variance below 0 is given as 0.
    """
    flow = taken.measured.flow
    return {
        "flow": flow.flow,
        "revision": flow.revision or None,
        "unit": flow.unit,
        "variant": flow.variant,
        "rows": taken.data.n_rows,
        "unreadable": taken.data.n_unreadable,
        "outliers": taken.measured.n_outliers,
        "readings": [reading_record(reading, flow.unit) for reading in taken.measured.readings],
        "sizes": [_size(found) for found in taken.sizes.found],
    }


def reading_record(reading: MeasuredReading, unit: str) -> Record:
    """Return one reading as a JSON-ready record."""
    fit, tally = reading.fit, reading.tally
    splits = {axis: split_record(reading.axes[axis].split, unit) for axis in AXES}
    return {
        "mask": reading.mask,
        "reference": reading.reference,
        "n": tally.n,
        "outliers": tally.n_outliers,
        "lots": tally.n_lots,
        "wafers": tally.n_wafers,
        "fields": tally.n_fields,
        **{axis: _axis(reading.axes[axis], splits[axis], unit) for axis in AXES},
        "wafer": _terms(fit.wafer, unit),
        "field": _terms(fit.field, unit),
        "errors": {"wafer": _terms(fit.wafer_errors, unit), "field": _terms(fit.field_errors, unit)},
        "variance": {level: _middle(splits["x"][level], splits["y"][level]) for level in LEVELS},
    }


def _axis(figures: AxisFigures, split: Record, unit: str) -> Record:
    plan = figures.plan
    return {
        "mean": in_unit(figures.mean, unit),
        "mean_error": in_unit(figures.mean_error, unit),
        "three_sigma": in_unit(figures.three_sigma, unit),
        "mean_plus_3sigma": in_unit(figures.mean_plus_3sigma, unit),
        "residual_three_sigma": in_unit(3 * figures.residual, unit),
        "variance": split,
        "planned": plan
        and {
            "offset": in_unit(plan.offset, unit),
            "bound": in_unit(plan.bound, unit),
            "three_sigma": in_unit(plan.three_sigma, unit),
            "mean_plus_3sigma": in_unit(plan.mean_plus_3sigma, unit),
        },
    }


def split_record(split: Split, unit: str) -> Record:
    """Return the components of a variance in the square of a unit, none below 0."""
    factor = convert(1.0, "nm", unit) ** 2
    values: dict[str, Any] = {level: getattr(split, level) for level in LEVELS}
    return {k: None if v is None else finite(max(v, 0.0) * factor) for k, v in values.items()}


def _middle(x: float | None, y: float | None) -> float | None:
    return None if x is None or y is None else finite((x + y) / 2)


def _terms(terms: dict[str, float | None], unit: str) -> Record:
    return {name: in_unit(v, unit) if name in _SHIFTS else finite(v) for name, v in terms.items()}


def _size(found: Found) -> Record:
    return {
        "mask": found.mask,
        "reference": found.reference,
        "axis": found.axis,
        "alignment": finite(found.random),
        "offset": finite(found.offset),
        "alignment_error": found.error,
        "exceeded": found.exceeded,
    }

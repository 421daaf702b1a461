"""Entries as plain records in the file's unit: what JSON, CSV and library users get."""

import math
from typing import Any

from flowplan.engine.analysis import Result
from flowplan.engine.landing import QUANTILES, LandingEntry
from flowplan.engine.points import Point
from flowplan.engine.results import ByBasis, Entry, Parts, SourceRow
from flowplan.model.flow import BASES
from flowplan.model.terms import SHAPE_DIMENSION
from flowplan.units import convert, significant

Record = dict[str, Any]


def in_unit(length_nm: float | None, unit: str) -> float | None:
    """Return a length in the file's unit to 12 significant digits; None for none or infinite."""
    if length_nm is None or not math.isfinite(length_nm):
        return None
    return significant(convert(length_nm, "nm", unit))


def finite(value: float | None) -> float | None:
    """Return a plain number to 12 significant digits; None for none or infinite."""
    return None if value is None or not math.isfinite(value) else significant(value)


def margins_document(result: Result) -> Record:
    """Return the whole answer as one JSON-ready document.

    Parameters
    ----------
    result : Result
        An analysis.

    Returns
    -------
    dict
        Keys as in the README, lengths in the file's unit, null for infinite values.
    """
    flow = result.flow
    return {
        "flow": flow.flow,
        "revision": flow.revision or None,
        "unit": flow.unit,
        "basis": flow.basis,
        "confidence": flow.confidence,
        "variant": flow.variant,
        "counts": dict(result.counts),
        "margins": [check_record(check, flow.unit) for check in result.checks],
    }


def entry_record(entry: Entry, unit: str) -> Record:
    """Return one entry as a JSON-ready record, lengths in `unit`."""
    ppm = None if entry.fail_probability is None else entry.fail_probability * 1e6
    return {
        "pair": entry.pair.name,
        "rule": entry.pair.rule,
        "layers": list(entry.layers),
        "axis": entry.axis,
        "chain": list(entry.chain.layers),
        "through": entry.chain.through,
        "drawn": in_unit(entry.drawn, unit),
        "keep": in_unit(entry.keep, unit),
        "nominal": in_unit(entry.nominal, unit),
        **_parts(entry.residual, unit),
        "overlay": _parts(entry.overlay, unit),
        "need": _by_basis(entry.need, unit),
        "margin": None if entry.margin is None else _by_basis(entry.margin, unit),
        "verdict": entry.verdict,
        "cpk": finite(entry.cpk),
        "fail_ppm": finite(ppm),
        "point": point_record(entry.point),
        "chain_rss": in_unit(entry.chain_rss, unit),
        "sources": [source_record(row, unit) for row in entry.sources],
    }


def check_record(check: Entry | LandingEntry, unit: str) -> Record:
    """Return what is judged as a JSON-ready record, of either kind."""
    return landing_record(check) if isinstance(check, LandingEntry) else entry_record(check, unit)


#: What a landed area does not have: it is no sum of errors along an axis.
_OF_AN_AXIS = (
    "drawn", "keep", "nominal", "offset", "bound", "random", "overlay", "need", "margin", "cpk", "chain_rss",
)  # fmt: skip


def landing_record(entry: LandingEntry) -> Record:
    """Return a landing as a JSON-ready record: areas as shares of the drawn one, resistances in ohm."""
    chain, fails = entry.chain, entry.fail_probability
    return {
        "pair": entry.pair.name,
        "rule": entry.pair.rule,
        "layers": list(entry.layers),
        "axis": entry.axis,
        "chain": None if chain is None else list(chain.layers),
        "through": None if chain is None else chain.through,
        **dict.fromkeys(_OF_AN_AXIS),
        "verdict": entry.verdict,
        "fail_ppm": None if fails is None else finite(fails * 1e6),
        "allowed_ppm": finite(entry.pair.allowed_ppm),
        "point": point_record(entry.point),
        "sources": [],
        "landing": {
            "nominal_area": finite(entry.nominal_area),
            "mean_area": finite(entry.mean_area),
            "area_quantiles": dict(zip(QUANTILES, map(finite, entry.area_quantiles), strict=True)),
            "p_below_least": finite(entry.below_least),
            "p_open": finite(entry.open),
            "resistance": _resistances(entry),
        },
    }


def _resistances(entry: LandingEntry) -> Record | None:
    found = entry.resistance
    if found is None:
        return None
    return {
        "nominal": finite(found.nominal),
        "median": finite(found.median),
        "q99": finite(found.q99),
        "p_above_limit": finite(found.above_limit),
    }


def _parts(parts: Parts, unit: str) -> Record:
    return {k: in_unit(getattr(parts, k), unit) for k in ("offset", "bound", "random")}


def _by_basis(figure: ByBasis, unit: str) -> Record:
    return {basis: in_unit(figure.on(basis), unit) for basis in BASES}


def point_record(point: Point | None) -> Record | None:
    """Return a point as a record in mm, or None."""
    if point is None:
        return None
    return {k: significant(getattr(point, k)) for k in ("X", "Y", "x", "y")}


def source_record(row: SourceRow, unit: str) -> Record:
    """Return one source; coefficient times size is its contribution in `unit`."""
    source = row.source
    is_length = SHAPE_DIMENSION[source.shape] == "length"
    coefficient = row.coefficient if is_length else convert(row.coefficient, "nm", unit)
    return {
        "name": source.name,
        "of": source.of,
        "kind": source.kind,
        "shape": source.shape,
        "coefficient": significant(coefficient),
        "size": in_unit(source.size, unit) if is_length else significant(source.size),
        "share": significant(row.share),
    }

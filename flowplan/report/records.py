"""Entries as plain records in the file's unit: what JSON, CSV and library users get."""

import math
from typing import Any

from flowplan.engine.analysis import Result
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


def margins_document(result: Result, entries: tuple[Entry, ...] | None = None) -> Record:
    """Return the whole answer as one JSON-ready document.

    Parameters
    ----------
    result : Result
        An analysis.
    entries : tuple of Entry, optional
        Only these entries; the counts are theirs.

    Returns
    -------
    dict
        Keys as in the README, lengths in the file's unit, null for infinite values.
    """
    flow = result.flow
    shown = result if entries is None else Result(result.engine, entries)
    return {
        "flow": flow.flow,
        "revision": flow.revision or None,
        "unit": flow.unit,
        "basis": flow.basis,
        "confidence": flow.confidence,
        "variant": flow.variant,
        "counts": dict(shown.counts),
        "margins": [entry_record(entry, flow.unit) for entry in shown.entries],
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

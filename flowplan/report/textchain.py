"""The explanation of a chain as a JSON-ready record, lengths in the file's unit."""

from collections.abc import Callable
from typing import Any

from flowplan.engine.explain import Change, Direct, Explanation, Hop, Shared
from flowplan.engine.markoutlook import Growth, Outlook, outlook, sites_read
from flowplan.engine.results import Entry, Parts
from flowplan.model.base import Axis
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites, Parameter
from flowplan.model.terms import SHAPE_DIMENSION
from flowplan.report.records import entry_record, finite, in_unit, point_record, source_record
from flowplan.units import significant

Record = dict[str, Any]


def explanation_record(explanation: Explanation, direct: Direct, flow: Flow) -> Record:
    """Return one axis of ``flowplan chain --format json``."""
    entry, unit = explanation.entry, flow.unit
    return {
        "axis": entry.axis,
        "chain": list(entry.chain.layers),
        "through": entry.chain.through,
        "one_of_several": entry.chain.one_of_several,
        "point": point_record(entry.point),
        "overlay": _parts(entry.overlay, unit),
        "chain_rss": in_unit(entry.chain_rss, unit),
        "excess": finite(explanation.excess),
        "hops": [_hop(hop, unit) for hop in explanation.hops],
        "shared": [_shared(row, unit) for row in explanation.shared],
        "sources": [source_record(row, unit) for row in entry.sources],
        "mark_sites": [outlook_record(*item, entry.axis, flow) for item in mark_sites(explanation, flow)],
        "direct": _direct(direct, unit),
    }


def mark_sites(explanation: Explanation, flow: Flow) -> list[tuple[Outlook, list[Hop]]]:
    """Return the alignments from mark sites on a chain, each with the hops that are read so."""
    found: dict[MarkSites, list[Hop]] = {}
    for hop in explanation.hops:
        sites = sites_read(flow, hop.child, hop.reference, explanation.entry.axis)
        if sites is not None:
            found.setdefault(sites, []).append(hop)
    return [(outlook(flow, sites), hops) for sites, hops in found.items()]


def outlook_record(found: Outlook, hops: list[Hop], axis: Axis, flow: Flow) -> Record:
    """Return an alignment from mark sites as a record: its random error at the flow's confidence."""

    def errors(growth: Growth) -> list[float | None]:
        return [in_unit(flow.confidence * s, flow.unit) for s in growth.sigma[axis].tolist()]

    return {
        "reads": [{"child": hop.child, "reference": hop.reference} for hop in hops],
        "model": found.sites.model,
        "over": found.sites.over,
        "marks": found.sites.count,
        "fitted": {
            parameter.name.replace(" ", "_"): _fitted(flow.confidence * sigma, parameter, flow.unit)
            for parameter, sigma in found.fitted
        },
        "distances": [significant(d) for d in found.planned.distances.tolist()],
        "random": errors(found.planned),
        "ring": {
            "radius": significant(found.radius),
            "tried": [{"marks": count, "random": errors(growth)} for count, growth in found.tried],
        },
    }


def _fitted(error: float, parameter: Parameter, unit: str) -> float | None:
    """Return a fitted parameter's error in the file's unit, urad or ppm."""
    is_length = SHAPE_DIMENSION[parameter.shape] == "length"
    return in_unit(error, unit) if is_length else significant(error)


def fitted_words(found: Outlook, flow: Flow, length: Callable[[float], str]) -> str:
    """Return the errors of what is fitted in words, at the flow's confidence; `length` words a length."""
    words = []
    for parameter, sigma in found.fitted:
        dimension, error = SHAPE_DIMENSION[parameter.shape], flow.confidence * sigma
        unit = {"angle": " urad", "ratio": " ppm"}.get(dimension, "")
        words.append(f"{parameter.name} ±{f'{error:.3g}{unit}' if unit else length(error)}")
    return ", ".join(words)


def _parts(parts: Parts, unit: str) -> Record:
    return {key: in_unit(getattr(parts, key), unit) for key in ("offset", "bound", "random")}


def _hop(hop: Hop, unit: str) -> Record:
    return {
        "child": hop.child,
        "reference": hop.reference,
        "follows": hop.follows,
        "weight": finite(hop.weight),
        "overlay": _parts(hop.overlay, unit),
        "sources": [source_record(row, unit) for row in hop.sources],
    }


def _shared(row: Shared, unit: str) -> Record:
    return {
        "name": row.source.name,
        "of": row.source.of,
        "kind": row.source.kind,
        "shape": row.source.shape,
        "effect": row.effect,
        "in_first": in_unit(row.in_first, unit),
        "in_second": in_unit(row.in_second, unit),
        "in_overlay": in_unit(row.in_overlay, unit),
        "apart": in_unit(row.apart, unit),
    }


def _direct(direct: Direct, unit: str) -> Record:
    record: Record = {"later": direct.later, "earlier": direct.earlier, "refusal": direct.refusal or None}
    if direct.overlay is None:
        return record
    before, after = direct.counts
    return record | {
        "overlay": {
            "before": _parts(direct.overlay.before.overlay, unit),
            "after": _parts(direct.overlay.after.overlay, unit),
        },
        "pairs": [_change(change, unit) for change in direct.pairs],
        "counts": {"before": dict(before), "after": dict(after)},
    }


def _change(change: Change, unit: str) -> Record:
    return {
        "pair": change.before.pair.name,
        "before": _verdict(change.before, unit),
        "after": _verdict(change.after, unit),
    }


def _verdict(entry: Entry, unit: str) -> Record:
    record = entry_record(entry, unit)
    return {key: record[key] for key in ("need", "margin", "verdict")}

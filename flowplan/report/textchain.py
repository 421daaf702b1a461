"""The explanation of a chain as a JSON-ready record, lengths in the file's unit."""

from typing import Any

from flowplan.engine.explain import Change, Direct, Explanation, Hop, Shared
from flowplan.engine.results import Entry, Parts
from flowplan.report.records import entry_record, finite, in_unit, point_record, source_record

Record = dict[str, Any]


def explanation_record(explanation: Explanation, direct: Direct, unit: str) -> Record:
    """Return one axis of ``flowplan chain --format json``."""
    entry = explanation.entry
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
        "direct": _direct(direct, unit),
    }


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

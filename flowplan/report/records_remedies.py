"""``flowplan remedies --format json``: what helps each pair, in the file's units."""

from typing import Any

from flowplan.engine.remedies.changes import Change, Redraw, Reread, Resize, SelfAlign
from flowplan.engine.remedies.result import Case, Remedies, Remedy
from flowplan.model.base import Axis
from flowplan.model.edits import Readings
from flowplan.model.masks import References
from flowplan.report.records import in_unit
from flowplan.report.records_levers import in_own_unit, own_unit
from flowplan.report.remedytext import RemedyWords
from flowplan.units import significant

Record = dict[str, Any]


def remedies_document(found: Remedies) -> Record:
    """Return remedies as one JSON-ready document, lengths in the file's unit.

    Parameters
    ----------
    found : Remedies
        What `remedies` returns.

    Returns
    -------
    dict
        One case a pair and axis, in file order; its remedies, the best first. Angles and ratios are
        in urad and ppm.
    """
    flow = found.flow
    return {
        "flow": flow.flow,
        "revision": flow.revision or None,
        "unit": flow.unit,
        "basis": flow.basis,
        "confidence": flow.confidence,
        "variant": flow.variant,
        "worst": in_unit(found.worst, flow.unit),
        "failing": found.failing,
        "cases": [_case(case, found) for case in found.cases],
    }


def _case(case: Case, found: Remedies) -> Record:
    words = RemedyWords(found)
    return {
        "pair": case.entry.pair.name,
        "layers": list(case.entry.layers),
        "axis": case.entry.axis,
        "chain": list(case.entry.chain.layers),
        "margin": in_unit(case.margin, found.flow.unit),
        "verdict": case.entry.verdict,
        "remedies": [_remedy(remedy, case, words, found.flow.unit) for remedy in case.remedies],
    }


def _remedy(remedy: Remedy, case: Case, words: RemedyWords, unit: str) -> Record:
    return {
        "kind": remedy.kind,
        "change": _change(remedy.change, unit),
        "margin": in_unit(remedy.margin, unit),
        "verdict": remedy.verdict,
        "enough": remedy.is_enough,
        "worst": in_unit(remedy.effect.worst, unit),
        "failing": remedy.effect.failing,
        "others_worse": remedy.effect.worse,
        "others_broken": remedy.effect.breaks,
        "for_zero": _value(remedy, remedy.for_zero, unit),
        "for_reserve": _value(remedy, remedy.for_reserve, unit),
        "text": words.sentence(case, remedy),
    }


def _value(remedy: Remedy, value: float | None, unit: str) -> float | None:
    if isinstance(remedy.change, Resize):
        return in_own_unit(remedy.change.quoted, value, unit)
    return in_unit(value, unit)


def _change(change: Change, unit: str) -> Record:
    if isinstance(change, Reread):
        return {
            "mask": change.mask,
            "axes": list(change.axes),
            "from": _readings(change.axes, change.before),
            "to": _readings(change.axes, change.after),
        }
    if isinstance(change, SelfAlign):
        return {"layer": change.layer, "follows": change.parent, "tone": change.tone}
    if isinstance(change, Redraw):
        return {
            "pair": change.pair,
            "axis": change.axis,
            "from": in_unit(change.before, unit),
            "to": in_unit(change.after, unit),
        }
    quoted = change.quoted
    return {
        "path": quoted.path,
        "axis": quoted.axis,
        "unit": own_unit(quoted, unit),
        "from": in_own_unit(quoted, change.before, unit),
        "to": in_own_unit(quoted, change.after, unit),
    }


def _readings(axes: tuple[Axis, ...], readings: tuple[Readings, ...]) -> Record:
    return {
        axis: [{"mask": r.mask, "weight": significant(w)} for r, w in _weighted(several)]
        for axis, several in zip(axes, readings, strict=True)
    }


def _weighted(readings: Readings) -> tuple[tuple[Any, float], ...]:
    return References.model_construct(x=readings, y=readings).weighted("x")

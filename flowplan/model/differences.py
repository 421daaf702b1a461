"""What changed from one flow to another, part by part, in the words of the file."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel

from flowplan.model.base import AXES, PerAxis
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites
from flowplan.model.masks import Follows, Reading, References, Tones
from flowplan.model.terms import SizeParts, Term

#: Parts of a flow that are compared entry by entry.
_GROUPS = ("tools", "masks", "self_aligned", "split_layers", "pairs")
_NOT_COMPARED = frozenset({"id", "name", "title", "notes", "owner", "why", "flow", "revision", "variants"})


@dataclass(frozen=True, slots=True)
class Difference:
    """One changed statement.

    Attributes
    ----------
    part : str
        Which part of the flow: ``masks``, ``tools``, ... or ``flow`` for its own numbers.
    of : str
        Id or name of the entry; empty for the flow's own numbers.
    what : str
        The key, such as ``aligns_to.x``; empty when the whole entry came or went.
    before, after : str
        As one would write them; empty where there is none.
    """

    part: str
    of: str
    what: str
    before: str
    after: str


def differences(before: Flow, after: Flow) -> tuple[Difference, ...]:
    """Return what changed, masks first, in the order of the file.

    Parameters
    ----------
    before, after : Flow
        Two checked flows; their units may differ, each figure is given as its file quotes it.

    Returns
    -------
    tuple of Difference
        Free text is left out, since it moves no margin.
    """
    found = [
        Difference("flow", "", key, old, new)
        for key, old, new in _changed(_own_numbers(before), _own_numbers(after))
    ]
    for part in ("masks", *(g for g in _GROUPS if g != "masks")):
        found += _group(part, _entries(before, part), _entries(after, part))
    return tuple(found)


def _group(part: str, before: dict[str, Any], after: dict[str, Any]) -> Iterator[Difference]:
    for name in dict.fromkeys((*before, *after)):
        old, new = before.get(name), after.get(name)
        if old is None or new is None:
            yield Difference(
                part, name, "", "" if old is None else "present", "" if new is None else "present"
            )
            continue
        for key, one, other in _changed(dict(_flat(old)), dict(_flat(new))):
            yield Difference(part, name, key, one, other)


def _changed(before: dict[str, str], after: dict[str, str]) -> Iterator[tuple[str, str, str]]:
    for key in dict.fromkeys((*before, *after)):
        old, new = before.get(key, ""), after.get(key, "")
        if old != new:
            yield key, old, new


def _own_numbers(flow: Flow) -> dict[str, str]:
    keys = [k for k in Flow.model_fields if k not in _GROUPS and k not in _NOT_COMPARED]
    return dict(item for key in keys for item in _flat(getattr(flow, key), key))


def _entries(flow: Flow, part: str) -> dict[str, Any]:
    group = getattr(flow, part)
    if isinstance(group, dict):
        return dict(group)
    return {getattr(entry, "id", "") or entry.name: entry for entry in group}


def _flat(value: Any, key: str = "") -> Iterator[tuple[str, str]]:
    """Yield (dotted key, text) of every statement below a value."""
    if value is None:
        return
    if isinstance(value, References | Follows | Tones):
        for axis in AXES:
            yield f"{key}.{axis}", _text(getattr(value, axis))
    elif isinstance(value, SizeParts):
        for kind, size in value.parts():
            yield f"{key}.{kind}", str(size)
        yield f"{key}.varies", value.varies or ""
        if isinstance(value, Term):
            yield from (
                (f"{key}.{k}", _text(getattr(value, k))) for k in ("enters", "shape", "over", "source")
            )
            yield f"{key}.common", f"{value.common_share:g}"
    elif isinstance(value, BaseModel) and not isinstance(value, PerAxis):
        for name in type(value).model_fields:
            if name not in _NOT_COMPARED:
                yield from _flat(getattr(value, name), f"{key}.{name}" if key else name)
    elif isinstance(value, dict):
        for name, inner in value.items():
            yield from _flat(inner, f"{key}.{name}" if key else name)
    else:
        yield key, _text(value)


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, tuple) and value and isinstance(value[0], Reading):
        return readings_text(value)
    if isinstance(value, tuple):
        return ", ".join(_text(v) for v in value)
    if isinstance(value, float):
        return f"{value:g}"
    return str(value)


def readings_text(readings: Iterable[Reading]) -> str:
    """Return references as one would say them, such as ``0.5 CONTACT + 0.5 GATE``.

    Parameters
    ----------
    readings : iterable of Reading
        What a mask reads along one axis.
    """
    several = tuple(readings)
    total = sum(r.weight or 1.0 for r in several)
    parts = [
        (f"{(r.weight or 1.0) / total:.3g} " if len(several) > 1 else "")
        + r.mask
        + (f" (alignment {size_text(r.alignment)})" if r.alignment else "")
        for r in several
    ]
    return " + ".join(parts)


def size_text(size: SizeParts | MarkSites) -> str:
    """Return a size as one would say it, such as ``30`` or ``random 30, bound 5``."""
    if isinstance(size, MarkSites):
        return f"{size}, {size_text(size.per_mark)} a mark"
    parts = size.parts()
    if len(parts) == 1 and parts[0][0] == "random":
        return str(parts[0][1])
    return ", ".join(f"{kind} {value}" for kind, value in parts)

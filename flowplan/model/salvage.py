"""What is left of a faulty flow, so that one run reports the faults of its references as well."""

import copy
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from flowplan.errors import Diagnostic, Path
from flowplan.model.base import WAFER
from flowplan.model.build import build, follow
from flowplan.model.flow import Flow

_ROUNDS = 5
#: In the first rounds values go, then what is left without its needed values: `{random: .nan}`, then `cd`.
_VALUES_ONLY = 2
#: Findings that rest on these parts of the flow, and mislead when something of them is missing.
_FROM_PARTS = {
    "FP403": frozenset({"field", "wafer"}),
    "FP404": frozenset({"field", "wafer", "unit"}),
    "FP206": frozenset({"field", "wafer", "unit"}),
}
#: Without these whole parts every reference to what they name would look wrong.
_NAMING: frozenset[Path] = frozenset({("tools",), ("masks",), ("self_aligned",), ("split_layers",)})


@dataclass(slots=True)
class Salvaged:
    """The sound remainder of a flow.

    Attributes
    ----------
    flow : Flow or None
        The remainder; None when too little is left.
    dropped : set of str
        Ids whose definition was taken out; findings about them would mislead.
    kept : dict
        For each list of the file, the original index of every entry that is left.
    lost_parts : set of str
        Keys of the flow itself whose value, or a part of it, was taken out.
    nameless : bool
        Whether something was dropped whose id is not known; any unknown id could be its.
    """

    flow: Flow | None = None
    dropped: set[str] = field(default_factory=set)
    kept: dict[str, list[int]] = field(default_factory=dict)
    lost_parts: set[str] = field(default_factory=set)
    nameless: bool = False

    def misleads(self, finding: Diagnostic) -> bool:
        """Whether a finding about the remainder only follows from what was taken out."""
        if finding.code in _FROM_PARTS and self.lost_parts & _FROM_PARTS[finding.code]:
            return True
        if finding.code == "FP205" and finding.path in (("tools",), ("masks",)):
            return bool(self.dropped) or self.nameless
        if self.nameless and finding.code == "FP301" and finding.path[-1:] != ("tool",):
            return True
        return any(repr(name) in finding.message for name in self.dropped)

    def original(self, path: Path) -> Path:
        """Translate a path in the remainder to the path in the whole file."""
        if len(path) > 1 and isinstance(path[1], int) and path[0] in self.kept:
            return (path[0], self.kept[str(path[0])][path[1]], *path[2:])
        return path


def salvage(data: object, diagnostics: Sequence[Diagnostic]) -> Salvaged:
    """Build what is left of a flow when its faulty places are taken out.

    First the faulty values alone are taken out, since most keys may be left out; where that is not
    enough, the whole mask, pair, tool or feature goes.

    Parameters
    ----------
    data : object
        The plain data that `build` refused; it is not changed.
    diagnostics : sequence of Diagnostic
        What `build` found wrong with it.

    Returns
    -------
    Salvaged
        The remainder with what is needed to report on it.
    """
    rest = copy.deepcopy(data)
    result = Salvaged()
    if isinstance(rest, dict):
        result.kept = {k: list(range(len(v))) for k, v in rest.items() if isinstance(v, list)}
    if isinstance(rest, dict):
        rest.setdefault("flow", "unnamed")
    left = tuple(diagnostics)
    for number in range(_ROUNDS):
        for diagnostic in left:
            _take_out(rest, diagnostic.path, result)
        if number >= _VALUES_ONLY:
            for entry in sorted({d.path[:2] for d in left if len(d.path) > 1}, key=_late_first, reverse=True):
                _drop_entry(rest, entry, result)
        _stand_in(rest)
        result.flow, left = build(rest)
        if result.flow is not None:
            break
    return result


def _late_first(entry: Path) -> tuple[str, int, str]:
    group, name = entry
    return str(group), name if isinstance(name, int) else 0, str(name)


def _take_out(data: object, path: Path, result: Salvaged) -> None:
    """Delete the value at a path from its mapping, where it stands in one."""
    parent = follow(data, path[:-1])
    if not path or not isinstance(parent, dict) or path[-1] == "id" or path in _NAMING:
        return
    parent.pop(path[-1], None)
    result.lost_parts.add(str(path[0]))
    if len(path) == 2 and path[:1] in _NAMING:
        result.dropped.add(str(path[1]))
    term = follow(data, path[:4])
    if path[2:3] == ("terms",) and isinstance(term, dict) and "source" in term:
        # what is left of the term no longer says how the shared source is quoted
        term.pop("source")
        term.pop("common", None)


def _stand_in(data: object) -> None:
    """Give masks and pairs that lost a needed value another, so that they are still checked."""
    if not isinstance(data, dict):
        return
    tools = data.get("tools")
    for mask in _entries(data.get("masks")):
        mask.setdefault("aligns_to", WAFER)
        if isinstance(tools, dict) and tools:
            mask.setdefault("tool", next(iter(tools)))
    for pair in _entries(data.get("pairs")):
        if pair.get("rule") not in ("overlay", "landing"):
            pair.setdefault("drawn", 0)


def _entries(group: object) -> list[dict[str, Any]]:
    return [entry for entry in group if isinstance(entry, dict)] if isinstance(group, list) else []


def _drop_entry(data: object, entry: Path, result: Salvaged) -> None:
    """Drop a whole mask, pair, tool or feature."""
    group = follow(data, entry[:1])
    name = entry[1]
    if isinstance(group, dict):
        group.pop(name, None)
        result.dropped.add(str(name))
    elif isinstance(group, list) and isinstance(name, int) and name < len(group):
        item = group.pop(name)
        result.kept[str(entry[0])].pop(name)
        given = item.get("id") if isinstance(item, dict) else item
        if isinstance(given, str):
            result.dropped |= {given, given.strip()}
        elif entry[0] in ("masks", "self_aligned"):
            result.nameless = True

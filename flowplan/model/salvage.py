"""What is left of a faulty flow, so that one run reports the faults of its references as well."""

import copy
from collections.abc import Sequence
from dataclasses import dataclass, field

from flowplan.errors import Diagnostic, Path
from flowplan.model.build import build, follow
from flowplan.model.flow import Flow

_ROUNDS = 5
#: In the first rounds values go, then what is left without its needed values: `{random: .nan}`, then `cd`.
_VALUES_ONLY = 2
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
    """

    flow: Flow | None = None
    dropped: set[str] = field(default_factory=set)
    kept: dict[str, list[int]] = field(default_factory=dict)

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
            _take_out(rest, diagnostic.path)
        if number >= _VALUES_ONLY:
            for entry in sorted({d.path[:2] for d in left if len(d.path) > 1}, key=str, reverse=True):
                _drop_entry(rest, entry, result)
        result.flow, left = build(rest)
        if result.flow is not None:
            break
    return result


def _take_out(data: object, path: Path) -> None:
    """Delete the value at a path from its mapping, where it stands in one."""
    parent = follow(data, path[:-1])
    if path and isinstance(parent, dict) and path[-1] != "id" and path not in _NAMING:
        parent.pop(path[-1], None)


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
        if isinstance(item, dict):
            result.dropped.add(str(item.get("id", "")))

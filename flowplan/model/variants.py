"""Variants: a named partial flow laid over the base, key by key and id by id.

The merge works on plain data, before the model is built, so that a variant is judged by exactly the
rules that a whole file is. `Provenance` remembers where each merged value was written, so that a
finding points at the variant's line where the variant is at fault.
"""

import copy
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

from pydantic import Field

from flowplan.errors import Diagnostic, Path, nearest
from flowplan.model.base import WAFER, Described, Id

Data = dict[str, Any]

#: Parts of the file that are lists of entries with a key of their own.
KEYED_LISTS = {"masks": "id", "self_aligned": "id", "pairs": "name"}
#: Where a mask that only a variant has comes in the process.
AFTER = "after"
#: Parts of the file that are mappings from an id to an entry.
MAPPINGS = ("tools", "split_layers")

_PART = "What this variant changes in `{0}`, by {1}; the rest stays. A value of null takes a key away."


class Variant(Described):
    """A named partial flow, laid over the rest of the file."""

    name: Id = Field(description="What `--variant` calls it.")
    note: str = Field("", description="What it tries, in a sentence; shown where plans are compared.")
    drop: tuple[Id, ...] = Field((), description="Ids, and names of pairs, that this variant leaves out.")
    tools: Any = Field(None, description=_PART.format("tools", "id"))
    masks: Any = Field(
        None,
        description=_PART.format("masks", "id")
        + " A mask that the base does not have says `after:` which mask it is exposed; it takes the place of "
        "a self-aligned feature of the same id.",
    )
    self_aligned: Any = Field(
        None,
        description=_PART.format("self_aligned", "id")
        + " A feature with the id of a mask takes that mask's place.",
    )
    split_layers: Any = Field(None, description=_PART.format("split_layers", "id"))
    pairs: Any = Field(None, description=_PART.format("pairs", "name"))
    revision: Any = Field(None, description="Revision of this variant.")
    sigma: Any = Field(None, description="Replaces the file's `sigma`.")
    confidence: Any = Field(None, description="Replaces the file's `confidence`.")
    basis: Any = Field(None, description="Replaces the file's `basis`.")
    reserve: Any = Field(None, description="Replaces the file's `reserve`.")
    wafer: Any = Field(None, description="What changes about the wafer.")
    field: Any = Field(None, description="What changes about the exposure field.")


#: Keys of a variant that are about the variant itself.
OWN_KEYS = frozenset({*Described.model_fields, "name", "note", "drop"})


@dataclass(slots=True)
class Provenance:
    """Where the values of a merged flow were written.

    Attributes
    ----------
    rows : dict
        For each keyed list of the merged flow, the path in the file of every entry.
    written : dict
        Paths in the merged flow that a variant wrote, each with its path in the file.
    """

    rows: dict[str, list[Path]] = field(default_factory=dict)
    written: dict[Path, Path] = field(default_factory=dict)

    def in_file(self, path: Path) -> Path:
        """Translate a path in the merged flow to the path where it was written."""
        for length in range(len(path), 0, -1):
            place = self.written.get(path[:length])
            if place is not None:
                return (*place, *path[length:])
        if len(path) > 1 and isinstance(path[1], int) and path[0] in self.rows:
            rows = self.rows[str(path[0])]
            if path[1] < len(rows):
                return (*rows[path[1]], *path[2:])
        return path


@dataclass(frozen=True, slots=True)
class Merged:
    """A base with a variant laid over it: plain data, its provenance and what went wrong."""

    variant: Data
    data: Data
    provenance: Provenance
    findings: tuple[Diagnostic, ...]


def merge_variant(base: Data, index: int) -> Merged:
    """Lay one of a file's variants over the rest of the file.

    Parameters
    ----------
    base : dict
        Plain data of the whole file; it is not changed.
    index : int
        Which entry of its ``variants``.

    Returns
    -------
    Merged
        Data without ``variants``; findings name ids that the variant changes or drops in vain.
    """
    return _Merge(base, index).run()


class _Merge:
    def __init__(self, base: Data, index: int) -> None:
        self.variant: Data = base["variants"][index]
        self.at: Path = ("variants", index)
        self.data: Data = copy.deepcopy({k: v for k, v in base.items() if k != "variants"})
        self.provenance = Provenance(
            {part: [(part, i) for i in range(len(self._list(part)))] for part in KEYED_LISTS}
        )
        self.findings: list[Diagnostic] = []

    def run(self) -> Merged:
        self._drop()
        entries = {part: [*self._entries(part, self.variant.get(part))] for part in KEYED_LISTS}
        # Rows come and go before any is changed: the provenance of a change names its row by number.
        for name, _, _ in entries["self_aligned"]:
            self._remove("masks", name)
        entries["masks"] = [e for e in entries["masks"] if not self._is_added_mask(*e)]
        for part, value in self.variant.items():
            if part in OWN_KEYS or part not in Variant.model_fields:
                continue
            if part in KEYED_LISTS:
                for entry in entries[part]:
                    self._change_entry(part, *entry)
            else:
                self._lay_over(self.data, part, value, (part,), (*self.at, part))
        return Merged(self.variant, self.data, self.provenance, tuple(self.findings))

    def _entries(self, part: str, value: object) -> Iterator[tuple[str, object, Path]]:
        """Yield (id or name, changes, place), from a mapping or from a list as the base writes it."""
        key = KEYED_LISTS[part]
        place = (*self.at, part)
        if isinstance(value, dict):
            yield from ((name, changes, (*place, name)) for name, changes in value.items())
        elif isinstance(value, list):
            for i, entry in enumerate(value):
                if isinstance(entry, dict) and isinstance(entry.get(key), str):
                    yield entry[key], {k: v for k, v in entry.items() if k != key}, (*place, i)
                else:
                    self._refuse("FP202", f"{key!r} is missing", f"add `{key}: …`", (*place, i))
        elif value is not None:
            self._refuse("FP203", f"a mapping from {key} to changes belongs here", "", place)

    def _refuse(self, code: str, message: str, hint: str, path: Path) -> None:
        self.findings.append(Diagnostic(code, message, hint, path))

    def _list(self, part: str) -> list[Any]:
        found = self.data.get(part)
        return found if isinstance(found, list) else []

    def _names(self, part: str) -> list[str]:
        key = KEYED_LISTS[part]
        return [str(e.get(key, "")) if isinstance(e, dict) else "" for e in self._list(part)]

    def _drop(self) -> None:
        dropped = self.variant.get("drop") or []
        for i, name in enumerate(dropped if isinstance(dropped, list) else []):
            if not any(self._remove(part, name) for part in (*KEYED_LISTS, *MAPPINGS)):
                known = [n for part in KEYED_LISTS for n in self._names(part) if n]
                message = f"the variant drops {name!r}, which the flow does not have"
                self._refuse("FP301", message, nearest(str(name), known), (*self.at, "drop", i))

    def _remove(self, part: str, name: object) -> bool:
        if part in MAPPINGS:
            group = self.data.get(part)
            return isinstance(group, dict) and isinstance(name, str) and group.pop(name, self) is not self
        names = self._names(part)
        if name not in names:
            return False
        place = names.index(str(name))
        self._list(part).pop(place)
        self.provenance.rows[part].pop(place)
        return True

    def _change_entry(self, part: str, name: str, changes: object, place: Path) -> None:
        names = self._names(part)
        if name in names:
            at = names.index(name)
            self._lay_over(self._list(part), at, changes, (part, at), place)
        elif part == "masks":
            message = f"the variant changes {name!r}, which is not a mask of the flow"
            hint = nearest(name, [n for n in names if n]) + "; a new mask says `after:` which one it comes"
            self._refuse("FP301", message, hint, place)
        else:
            self._append(part, name, changes, place)

    def _is_added_mask(self, name: str, mask: object, place: Path) -> bool:
        """Add a mask that says where it belongs; it takes the place of a feature of the same id."""
        names = self._names("masks")
        if name in names or not isinstance(mask, dict) or AFTER not in mask:
            return False
        before = [WAFER, *names]
        if mask[AFTER] not in before:
            message = f"{name!r} comes after {mask[AFTER]!r}, which is not a mask of the flow"
            self._refuse("FP301", message, nearest(str(mask[AFTER]), before), (*place, AFTER))
            return True
        at = before.index(mask[AFTER])
        added = {"id": name} | {k: v for k, v in mask.items() if k != AFTER}
        self._list("masks").insert(at, copy.deepcopy(added))
        self.provenance.rows["masks"].insert(at, place)
        self._remove("self_aligned", name)
        return True

    def _append(self, part: str, name: str, entry: object, place: Path) -> None:
        if self.data.get(part) is None:
            self.data[part] = []
        rows = self.data[part]
        if not isinstance(rows, list):
            return
        if isinstance(entry, dict):
            entry = {KEYED_LISTS[part]: name} | entry
        rows.append(copy.deepcopy(entry))
        self.provenance.rows[part].append(place)

    def _lay_over(self, parent: Any, key: Any, value: object, path: Path, place: Path) -> None:
        """Replace a value, or merge mappings whose keys are names; null takes a key away."""
        old = parent[key] if isinstance(parent, list) else parent.get(key)
        if value is None and isinstance(parent, dict):
            parent.pop(key, None)
        elif isinstance(old, dict) and isinstance(value, dict) and _merges(path):
            for inner, changed in value.items():
                self._lay_over(old, inner, changed, (*path, inner), (*place, inner))
        else:
            parent[key] = copy.deepcopy(value)
            self.provenance.written[path] = place


def _merges(path: Path) -> bool:
    """Whether a mapping at this path is merged key by key rather than replaced.

    Tools, masks, features, pairs and their terms are; a value such as ``aligns_to`` or ``cd`` is one
    statement and is replaced whole.
    """
    if path[0] in KEYED_LISTS or path[0] == "tools":
        inner = path[2:]
        return not inner or inner[0] == "terms"
    return path[0] in ("wafer", "field") or path == ("split_layers",)

"""The same flow written in another way: other names, other units, other order."""

from collections.abc import Callable
from typing import Any

from tests.support.byhand import FACTORS
from tests.support.flows import Data

#: Keys whose value is a quantity, or one a kind or an axis.
_QUANTITIES = (
    "random", "uniform", "bound", "offset", "alignment", "wafer_alignment", "mark_reading", "cd", "edge",
    "drawn", "keep", "limit", "diameter", "edge_exclusion",
)  # fmt: skip


def quantities_changed(part: Any, change: Callable[[Any], Any], inside: bool = False) -> Any:
    """Return plain data with every quantity run through `change`."""
    if isinstance(part, list):
        return [quantities_changed(p, change, inside) for p in part]
    if not isinstance(part, dict):
        return change(part) if inside else part
    found = {}
    for key, value in part.items():
        named = key in _QUANTITIES or (inside and key in ("x", "y")) or key in ("terms", "field")
        found[key] = _terms(value, change) if key == "terms" else quantities_changed(value, change, named)
    return found


def _terms(terms: Data, change: Callable[[Any], Any]) -> Data:
    """A term is a quantity, one for each axis, or a mapping with its kinds among other keys."""
    return {
        name: quantities_changed(term, change, not isinstance(term, dict) or set(term) <= {"x", "y"})
        for name, term in terms.items()
    }


def lengths_in(data: Data, unit: str) -> Data:
    """Return the flow with `unit` as its file unit and every length still as long."""
    file_unit = data["unit"]

    def change(quantity: Any) -> Any:
        if isinstance(quantity, str):
            return quantity
        return f"{quantity!r} {file_unit}"

    return {**quantities_changed(data, change), "unit": unit}


def scaled(data: Data, factor: float) -> Data:
    """Return the flow with every error and every drawn length multiplied by a power of 2."""

    def change(quantity: Any) -> Any:
        if isinstance(quantity, str):
            number, unit = quantity.split()
            assert unit in FACTORS
            return f"{float(number) * factor!r} {unit}"
        return quantity * factor

    geometry = {key: data[key] for key in ("wafer", "field")}
    return {**quantities_changed(data, change), **geometry}


def renamed(data: Data, new: Callable[[str], str]) -> Data:
    """Return the flow with every id, tool, term and source under another name."""
    ids = {m["id"] for m in data["masks"]} | {f["id"] for f in data["self_aligned"]}
    ids |= set(data.get("split_layers", ())) | set(data["tools"])

    def walk(part: Any, key: str = "") -> Any:
        if isinstance(part, list):
            return [walk(p, key) for p in part]
        if isinstance(part, dict):
            open_keys = key in ("tools", "terms", "split_layers")
            return {
                new(k) if open_keys else k: walk(v, "" if open_keys and key != "split_layers" else k)
                for k, v in part.items()
            }
        if isinstance(part, str) and (part in ids or key == "source"):
            return new(part)
        return part

    return walk(data)

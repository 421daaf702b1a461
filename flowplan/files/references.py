"""References as one writes them in a flow file, and writing them back into its text."""

import json
import re
from collections.abc import Mapping
from typing import Any

from flowplan.errors import Path
from flowplan.files.reader import parse
from flowplan.files.rewrite import replace_values
from flowplan.files.yamltext import plain_scalar
from flowplan.model.base import AXES, Axis, PerAxis
from flowplan.model.edits import Readings, with_references
from flowplan.model.flow import Flow
from flowplan.model.marksites import MarkSites, RingSites
from flowplan.model.masks import Reading, References
from flowplan.model.terms import SizeParts
from flowplan.units import Quantity

_PLAIN_TEXT = re.compile(r"[A-Za-z_0-9.+-][A-Za-z_0-9.+% -]*(?<! )")


def readings_data(readings: Readings) -> Any:
    """Return what is read along one axis as plain data, the way a flow file has it.

    Parameters
    ----------
    readings : tuple of Reading
        One reference, or the parts of an average.

    Returns
    -------
    str, dict or list
        An id where that says it all.
    """
    entries = [_reading_data(reading) for reading in readings]
    return entries[0] if len(entries) == 1 else entries


def _reading_data(reading: Reading) -> Any:
    data: dict[str, Any] = {"mask": reading.mask}
    if reading.weight is not None:
        data["weight"] = reading.weight
    if reading.alignment is not None:
        data["alignment"] = _size_data(reading.alignment)
    return reading.mask if len(data) == 1 else data


def _size_data(size: SizeParts | MarkSites) -> Any:
    if isinstance(size, MarkSites):
        return _sites_data(size)
    parts = {kind: _per_axis_data(value) for kind, value in size.parts()}
    if size.varies is not None:
        return parts | {"varies": size.varies}
    return parts["random"] if [*parts] == ["random"] else parts


def _sites_data(given: MarkSites) -> Any:
    sites: Any
    if isinstance(given.sites, RingSites):
        ring = given.sites.ring
        sites = {"ring": {"count": ring.count, "radius": _quantity_data(ring.radius)}}
    else:
        sites = [{"x": _quantity_data(site.x), "y": _quantity_data(site.y)} for site in given.sites]
    data = {"per_mark": _size_data(given.per_mark), "sites": sites, "model": given.model}
    return data if given.over == "wafer" else data | {"over": given.over}


def _per_axis_data(value: PerAxis) -> Any:
    x, y = (_quantity_data(value.on(axis)) for axis in AXES)
    return x if x == y else {"x": x, "y": y}


def _quantity_data(quantity: Quantity) -> float | str:
    number = int(quantity.value) if quantity.value.is_integer() else quantity.value
    return number if quantity.unit is None else f"{number} {quantity.unit}"


def references_data(references: References) -> Any:
    """Return ``aligns_to`` as plain data, the axes apart only where they differ."""
    x, y = (readings_data(references.on(axis)) for axis in AXES)
    return x if x == y else {"x": x, "y": y}


def one_line(data: Any) -> str:
    """Return plain data as YAML on one line.

    Parameters
    ----------
    data : dict, list, str, int or float
        What a flow file's value can be.
    """
    if isinstance(data, dict):
        return "{" + ", ".join(f"{_text(key)}: {one_line(value)}" for key, value in data.items()) + "}"
    if isinstance(data, list):
        return "[" + ", ".join(one_line(value) for value in data) + "]"
    return _text(data) if isinstance(data, str) else repr(data)


def _text(text: str) -> str:
    if _PLAIN_TEXT.fullmatch(text) and plain_scalar(text) == text and not text.startswith("-"):
        return text
    return json.dumps(text, ensure_ascii=False)


def write_references(
    text: str, flow: Flow, choices: Mapping[tuple[str, Axis], Readings], name: str = "<text>"
) -> str:
    """Return a flow file's text with other references, every other line and comment kept.

    Parameters
    ----------
    text : str
        The file that `flow` was read from.
    flow : Flow
        Its own plan.
    choices : mapping of (mask id, axis) to readings
        What is read instead.
    name : str
        What diagnostics call the file.

    Returns
    -------
    str
        The new text; read again, it gives exactly the changed flow.

    Raises
    ------
    UsageError
        FP602, when a mask's references do not stand in the text.
    """
    changed = with_references(flow, choices)
    pairs = zip(flow.masks, changed.masks, strict=True)
    values: dict[Path, str] = {
        ("masks", i, "aligns_to"): one_line(references_data(new.aligns_to))
        for i, (old, new) in enumerate(pairs)
        if old is not new
    }
    written = replace_values(text, values, name)
    if parse(written, name).flow != changed:
        msg = "the written flow does not read back as the plan"
        raise RuntimeError(msg)
    return written

"""Every variant of a file as a flow of its own, with what is wrong about it at the variant's lines."""

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from flowplan.errors import Diagnostic, Path
from flowplan.model.flow import Flow
from flowplan.model.variants import KEYED_LISTS, Merged, merge_variant

Data = dict[str, Any]
Examined = tuple[Flow | None, tuple[Diagnostic, ...]]
Examine = Callable[[Data], Examined]


def read_variants(
    data: Data, base: Examined, examine: Examine
) -> tuple[dict[str, Flow], tuple[Diagnostic, ...]]:
    """Build and check the variants of a file.

    Parameters
    ----------
    data : dict
        Plain data of the whole file.
    base : (Flow or None, findings)
        What `examine` said of the file's own plan.
    examine : callable
        Builds and checks plain data as a flow.

    Returns
    -------
    variants : dict
        The sound variants by name, in file order.
    findings : tuple of Diagnostic
        What the base does not have already, each with a path in the file.
    """
    named = _with_names(data, base[0])
    known = {(d.path, d.message) for d in base[1]}
    flows: dict[str, Flow] = {}
    findings: list[Diagnostic] = []
    entries = data.get("variants")
    for i, entry in enumerate(entries if isinstance(entries, list) else []):
        name = entry.get("name") if isinstance(entry, dict) else None
        if not isinstance(name, str):
            continue
        merged = merge_variant(named, i)
        flow, found = examine(merged.data)
        findings += merged.findings
        findings += _of_variant(merged, i, found, known, whole=base[0] is not None)
        if flow is not None and name not in flows:
            flows[name] = flow.as_variant(name)
    return flows, tuple(findings)


def _with_names(data: Data, flow: Flow | None) -> Data:
    """Return the data with every pair's name, so that a variant can call it by the name it is given."""
    if flow is None:
        return data
    pairs = [row | {"name": pair.name} for row, pair in zip(data.get("pairs") or (), flow.pairs, strict=True)]
    return data | {"pairs": pairs}


def _of_variant(
    merged: Merged, index: int, found: tuple[Diagnostic, ...], known: set[tuple[Path, str]], *, whole: bool
) -> list[Diagnostic]:
    """Return the findings that are this variant's doing, at its own lines."""
    result = []
    for finding in found:
        path = merged.provenance.in_file(finding.path)
        inside = path[:2] == ("variants", index)
        if (path, finding.message) in known or (finding.severity == "warning" and not inside):
            continue
        if inside:
            result.append(replace(finding, path=path))
        elif whole:
            result.append(_blamed(merged, index, finding))
    return result


def _blamed(merged: Merged, index: int, finding: Diagnostic) -> Diagnostic:
    """Return a finding about a part that the variant leaves alone but takes something away from."""
    variant = merged.variant
    for i, name in enumerate(variant.get("drop") or ()):
        if finding.path and repr(name) in finding.message:
            needs = _whose(merged.data, finding.path)
            message = f"the variant drops {name!r}, which {needs} needs"
            hint = f"drop or change {needs} too, or add a self-aligned feature {name!r}"
            return Diagnostic(finding.code, message, hint, ("variants", index, "drop", i))
    message = f"in the variant {variant['name']!r}: {finding.message}"
    return replace(finding, message=message, path=("variants", index))


def _whose(data: Data, path: Path) -> str:
    """Return what a path is about, such as ``the pair 'gate on active'``."""
    part, place = path[0], path[1] if len(path) > 1 else ""
    key = KEYED_LISTS.get(str(part))
    if key and isinstance(place, int):
        place = data[str(part)][place].get(key, place)
    word = {"pairs": "pair", "masks": "mask", "self_aligned": "feature", "split_layers": "split layer"}
    return f"the {word.get(str(part), str(part))} {place!r}"

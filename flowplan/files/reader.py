"""Reading a flow file: bytes, text, plain data, model, checks; each finding with its place."""

import os
from dataclasses import dataclass

from flowplan.errors import Diagnostic, FlowError, Span, UsageError, in_brief, nearest
from flowplan.files.inputfile import decode, read_bytes
from flowplan.files.plans import Examined, read_variants
from flowplan.files.yamltext import Places, read_yaml
from flowplan.model.build import MOST_DIAGNOSTICS, build
from flowplan.model.check import check
from flowplan.model.flow import Flow
from flowplan.model.salvage import salvage

_AT_KEY = frozenset({"FP201", "FP309", "FP105"})


@dataclass(frozen=True, slots=True)
class Loaded:
    """A sound flow with the warnings found in it, and the file's variants by name."""

    flow: Flow
    warnings: tuple[Diagnostic, ...]
    variants: dict[str, Flow]

    def plan(self, variant: str | None = None) -> Flow:
        """Return the file's own plan, or one of its variants.

        Raises
        ------
        UsageError
            FP605, for a name that no variant has.
        """
        if variant is None:
            return self.flow
        if variant not in self.variants:
            hint = nearest(variant, list(self.variants)) or "add it under `variants:`"
            raise UsageError([Diagnostic("FP605", f"the flow has no variant {variant!r}", hint)])
        return self.variants[variant]


def load(file: str | os.PathLike[str], variant: str | None = None) -> Flow:
    """Read a flow file.

    Parameters
    ----------
    file : path-like
        A YAML file.
    variant : str, optional
        The name of one of its variants; the file's own plan when left out.

    Returns
    -------
    Flow
        The flow, checked.

    Raises
    ------
    FlowError
        When anything is wrong with the file; holds every finding with line and column.
    UsageError
        FP605, for a name that no variant has.
    """
    return load_with_warnings(file).plan(variant)


def load_with_warnings(file: str | os.PathLike[str]) -> Loaded:
    """Read a flow file and keep the warnings; see `load`."""
    name = os.fspath(file)
    return parse_bytes(read_bytes(file), name)


def parse_bytes(raw: bytes, name: str) -> Loaded:
    """Read a flow from the bytes of a file or of a stream; see `parse`."""
    return parse(decode(raw, name), name)


def parse(text: str, name: str = "<text>") -> Loaded:
    """Read a flow from text.

    Parameters
    ----------
    text : str
        YAML text.
    name : str
        What diagnostics call the file.

    Returns
    -------
    Loaded
        The flow and its warnings.

    Raises
    ------
    FlowError
        With every finding, warnings included.
    """
    data, places = read_yaml(text, name)
    if not isinstance(data, dict):
        what = "the file is empty" if data is None else "a flow file is a mapping (key: value)"
        hint = "`flowplan new` writes a starter flow"
        raise FlowError([Diagnostic("FP108", what, hint, span=Span(name, 1, 1)), *places.problems])
    flow, findings = base = _examine(data)
    variants, of_variants = read_variants(data, base, _examine)
    placed = _place((*places.problems, *findings, *of_variants), places)
    if flow is None or any(d.severity == "error" for d in placed):
        raise FlowError(placed)
    return Loaded(flow, placed, variants)


def _examine(data: dict[str, object]) -> Examined:
    """Build plain data as a flow and check it."""
    flow, findings = build(data)
    found = check(flow) if flow is not None else (*findings, *_findings_in_remainder(data, findings))
    return flow, found


def _findings_in_remainder(data: object, findings: tuple[Diagnostic, ...]) -> list[Diagnostic]:
    if len(findings) >= MOST_DIAGNOSTICS:
        return []  # the list is as long as helps
    rest = salvage(data, findings)
    if rest.flow is None or not isinstance(data, dict):
        return []
    return [
        Diagnostic(d.code, d.message, d.hint, rest.original(d.path), None, d.severity)
        for d in check(rest.flow)
        if d.severity == "error" and not rest.misleads(d)
    ]


def _place(findings: tuple[Diagnostic, ...], places: Places) -> tuple[Diagnostic, ...]:
    placed = [
        d if d.span else in_brief(d).at(places.span(d.path, of_key=d.code in _AT_KEY)) for d in findings
    ]
    once = {(d.span, d.message): d for d in placed}
    return tuple(sorted(once.values(), key=_position))


def _position(finding: Diagnostic) -> tuple[int, int]:
    span = finding.span or Span("", 0, 0)
    return span.line, span.column

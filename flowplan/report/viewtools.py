"""Tools, their terms and the terms of single masks, with their notes."""

from dataclasses import dataclass

from flowplan.model.marksites import MarkSites
from flowplan.model.terms import Size, Term
from flowplan.report.viewbase import Base, LayerName, percent
from flowplan.report.viewmasks import size_words
from flowplan.report.viewpairs import remarks_of


@dataclass(frozen=True, slots=True)
class TermRow:
    """One error term."""

    name: str
    size: str
    enters: str
    shape: str
    common: str
    remarks: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class ToolView:
    """One exposure tool."""

    anchor: str
    id: str
    alignment: str
    wafer_alignment: str
    remarks: tuple[tuple[str, str], ...]
    masks: tuple[LayerName, ...]
    terms: tuple[TermRow, ...]


@dataclass(frozen=True, slots=True)
class MaskTerm:
    """A term of one mask alone, or a reading that overrides its tool's alignment."""

    layer: LayerName
    term: TermRow


def tool_anchors(base: Base) -> dict[str, str]:
    """Return the anchor of each tool's block, made from its place."""
    return {name: f"t{i}" for i, name in enumerate(base.result.flow.tools, start=1)}


def tools_view(base: Base) -> tuple[ToolView, ...]:
    """Return the tools in file order."""
    flow, anchors = base.result.flow, tool_anchors(base)
    return tuple(
        ToolView(
            anchors[name],
            name,
            size_words(base, tool.alignment),
            size_words(base, tool.wafer_alignment),
            remarks_of(tool),
            tuple(base.names[m.id] for m in flow.masks if m.tool == name),
            tuple(_term(base, label, term, on_tool=True) for label, term in tool.terms.items()),
        )
        for name, tool in flow.tools.items()
    )


def mask_terms_view(base: Base) -> tuple[MaskTerm, ...]:
    """Return what single masks add to their tools' terms, in process order."""
    found = []
    for mask in base.result.flow.masks:
        rows = [_term(base, label, term, on_tool=False) for label, term in mask.terms.items()]
        readings = dict.fromkeys((*mask.aligns_to.x, *mask.aligns_to.y))
        rows += [
            TermRow(
                f"alignment to {r.mask}",
                size_words(base, r.alignment),
                "reading",
                _shape(r.alignment),
                "",
                (),
            )
            for r in readings
            if r.alignment is not None
        ]
        found += [MaskTerm(base.names[mask.id], row) for row in rows]
    return tuple(found)


def _shape(alignment: Size | MarkSites) -> str:
    return "shift" if isinstance(alignment, Size) else f"fitted over the {alignment.over}"


def _term(base: Base, name: str, term: Term, *, on_tool: bool) -> TermRow:
    shape = "shift" if term.shape == "shift" else f"{term.shape} over the {term.over}"
    share = term.common_share
    where = "all masks on this tool" if term.source is None else f"source {term.source}"
    common = f"{percent(share)} with {where}" if share and (on_tool or term.source is not None) else ""
    return TermRow(name, size_words(base, term), term.enters, shape, common, remarks_of(term))

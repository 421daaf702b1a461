"""What the figures rest on, in words: assumptions, findings, glossary, caution."""

from dataclasses import dataclass

from flowplan.model.check import check
from flowplan.model.flow import Flow
from flowplan.report.viewbase import BASIS_WORDS, Base, counted, percent, plain

CAUTION = (
    "These figures are a planning estimate. They are as good as the sizes in the flow file and are to be "
    "confirmed on silicon, with measured overlay and CD, before anything is released on them.",
    "For hazardous steps (chemicals, gases, high voltage, radiation) local safety rules and qualified staff "
    "decide; nothing here replaces them.",
)

GLOSSARY: tuple[tuple[str, str], ...] = (
    ("Alignment mark", "A target that one mask prints and a later exposure reads to find its place."),
    (
        "Alignment tree",
        "Which mask reads the marks of which earlier one; each layer inherits its place along it.",
    ),
    ("Basis", "How bounds and random parts add up to the need: mixed, rss or linear."),
    ("Bound", "An error up to a size, of unknown sign, the same on every wafer."),
    ("CD", "Critical dimension: the width of a printed feature. When it varies, each edge moves by half."),
    ("Chain", "The way from one layer up to the reference that both derive from and down to the other."),
    ("Cpk", "Distance from the nominal to the limit, less bounds, over three standard deviations."),
    ("Enclosure", "One layer lies inside another with a drawn border on every side."),
    ("Extension", "One layer reaches past the edge of another."),
    (
        "Fails, ppm",
        "Parts per million in which the residual passes the limit on either side, normal errors assumed.",
    ),
    ("Margin", "What is left of the drawn dimension after known offsets, what must remain, and the need."),
    ("Need", "What the errors take of the drawn dimension at the stated confidence."),
    ("Offset", "A known, signed error; it shifts the nominal."),
    ("Overlay", "One layer's place against another's; here second minus first."),
    ("Overlap", "Two layers cover a common strip."),
    ("Registration", "One layer's place against the ideal grid."),
    ("RSS", "Root-sum-square: independent random parts add as squares."),
    (
        "Self-aligned",
        "A feature that takes its place from another layer's pattern, without an exposure of its own.",
    ),
    ("Spacing", "Two layers keep apart."),
    ("Tight", "The margin is not below 0 but below the reserve, a share of the drawn value."),
)


@dataclass(frozen=True, slots=True)
class NotesView:
    """The closing sections."""

    assumptions: tuple[str, ...]
    findings: tuple[tuple[str, str], ...]
    glossary: tuple[tuple[str, str], ...]
    caution: tuple[str, ...]


def notes_view(base: Base) -> NotesView:
    """Return the closing sections of the report."""
    flow = base.result.flow
    findings = tuple((d.message, d.hint) for d in check(flow) if d.severity == "warning")
    return NotesView(_assumptions(base, flow), findings, GLOSSARY, CAUTION)


def _assumptions(base: Base, flow: Flow) -> tuple[str, ...]:
    reserve = (
        f"A margin below {percent(flow.reserve)} of the drawn value is called tight."
        if flow.reserve
        else "No reserve is set, so no margin is called tight."
    )
    return (
        f"Random sizes in the flow file are quoted at {plain(flow.sigma)} standard deviations; the verdict "
        f"is taken at {plain(flow.confidence)}.",
        f"The verdict uses the basis {flow.basis}: {BASIS_WORDS[flow.basis]}. The two others "
        "stand beside it.",
        "Random errors are normal and independent of each other unless the flow file names them as one "
        "source; uniform errors count with their standard deviation, the half-width over √3.",
        "Bounds have an unknown sign and add up in size; known offsets add up with their signs.",
        "Each axis stands on its own; a pair is judged along x and along y, not along the diagonal.",
        *_landings(base),
        "What two layers inherit from a common reference cancels between them exactly and is not counted.",
        "Overlay is the second layer's place minus the first's. SEMI P18 writes the lower pattern minus the "
        "upper one; only the sign of offsets differs.",
        reserve,
        _where(base),
    )


def _landings(base: Base) -> tuple[str, ...]:
    if not base.result.landings:
        return ()
    return (
        "A landing pair is judged by its area, x and y together; remedies, levers and proposed references "
        "look only at what is judged along an axis.",
    )


def _where(base: Base) -> str:
    sites = base.result.engine.sites
    if sites.n_points == 1:
        return "No error depends on position, so every margin is the same everywhere on the wafer."
    per_field = sites.n_points // sites.n_fields
    fields = counted(sites.n_fields, "whole field")
    return (
        f"Each margin is taken at its worst point among {sites.n_points} sites: {per_field} sites (corners, "
        f"edge middles, centre) in {fields} inside the usable wafer. Sites between them are not looked at."
    )

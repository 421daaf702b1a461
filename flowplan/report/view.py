"""The whole view of a report: every calculation, rounding and sort done, ready for the template."""

from collections.abc import Callable
from dataclasses import dataclass
from importlib.metadata import PackageNotFoundError, version

from flowplan.engine.analysis import Result
from flowplan.report.comparison import ComparisonText
from flowplan.report.proposal import LadderText
from flowplan.report.remedytext import RemediesText
from flowplan.report.viewanswer import AnswerView, answer_view
from flowplan.report.viewbase import Base, plain
from flowplan.report.viewbudget import BudgetBook
from flowplan.report.viewhops import HopBook
from flowplan.report.viewlanding import LandingRow, landings_view
from flowplan.report.viewmap import LEVELS, MapFrame, map_frame, maps_of
from flowplan.report.viewmargins import MarginsView, margins_view
from flowplan.report.viewmarks import MarksView, marks_view
from flowplan.report.viewmasks import FeatureView, MaskRow, features_view, masks_view
from flowplan.report.viewmatrix import MatrixView, matrix_view
from flowplan.report.viewmeasured import MeasuredView
from flowplan.report.viewnotes import NotesView, notes_view
from flowplan.report.viewpairs import Books, PairView, pairs_view, remarks_of
from flowplan.report.viewsimulation import SimulationView
from flowplan.report.viewtools import MaskTerm, ToolView, mask_terms_view, tool_anchors, tools_view
from flowplan.report.viewtree import TreeView, tree_view

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True)
class HeadView:
    """The head of the document."""

    flow: str
    revision: str
    variant: str
    unit: str
    confidence: str
    basis: str
    remarks: tuple[tuple[str, str], ...]
    version: str


@dataclass(frozen=True, slots=True)
class Extras:
    """Sections beyond the margins, on choosing and statistics; None where there is nothing to show."""

    comparison: ComparisonText | None = None
    remedies: RemediesText | None = None
    ladder: LadderText | None = None
    simulation: SimulationView | None = None
    measured: MeasuredView | None = None


@dataclass(frozen=True, slots=True)
class ReportView:
    """Everything the page shows, in its order."""

    head: HeadView
    n_pairs: int
    answer: AnswerView
    tree: TreeView
    margins: MarginsView
    landings: tuple[LandingRow, ...]
    matrix: MatrixView
    map_frame: MapFrame | None
    map_levels: int
    pairs: tuple[PairView, ...]
    masks: tuple[MaskRow, ...]
    tools: tuple[ToolView, ...]
    mask_terms: tuple[MaskTerm, ...]
    features: tuple[FeatureView, ...]
    mark_sites: tuple[MarksView, ...]
    notes: NotesView
    extras: Extras


def report_view(result: Result, progress: Progress | None = None, extras: Extras | None = None) -> ReportView:
    """Return the view of a result.

    Parameters
    ----------
    result : Result
        An analysis.
    progress : callable, optional
        Called with (pairs done, pairs in all).
    extras : Extras, optional
        What helps to choose among plans.
    """
    base = Base(result)
    book = HopBook(base)
    frame = map_frame(base)
    return ReportView(
        head=_head(base),
        n_pairs=base.n_pairs,
        answer=answer_view(base, book),
        tree=tree_view(base),
        margins=margins_view(base),
        landings=landings_view(base),
        matrix=matrix_view(base),
        map_frame=frame,
        map_levels=LEVELS,
        pairs=pairs_view(Books(base, book, BudgetBook(base), maps_of(base, frame)), progress),
        masks=masks_view(base, tool_anchors(base)),
        tools=tools_view(base),
        mask_terms=mask_terms_view(base),
        features=features_view(base),
        mark_sites=marks_view(base),
        notes=notes_view(base),
        extras=extras or Extras(),
    )


def _head(base: Base) -> HeadView:
    flow = base.result.flow
    return HeadView(
        flow.flow,
        flow.revision,
        flow.variant or "",
        flow.unit,
        plain(flow.confidence),
        flow.basis,
        remarks_of(flow),
        package_version(),
    )


def package_version() -> str:
    """Return the version that the page names; empty in a source tree that is not installed."""
    try:
        return version("flowplan")
    except PackageNotFoundError:
        return ""

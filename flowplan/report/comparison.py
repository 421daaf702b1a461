"""Plans side by side as records for programs and as text for people."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from string import ascii_uppercase

from flowplan.engine.compare import Comparison, LandingRow, Plan, Row
from flowplan.model.differences import Difference
from flowplan.report.landing import ppm
from flowplan.report.records import Record, finite, in_unit
from flowplan.report.textfigures import Figures

_PARTS = {
    "flow": "flow", "masks": "mask", "tools": "tool", "self_aligned": "self-aligned",
    "split_layers": "split layer", "pairs": "pair",
}  # fmt: skip
_FATES = {
    "appears": "appears",
    "disappears": "is gone",
    "settled": "settled",
    "unsettled": "no longer settled",
}
_NONE = "\N{EN DASH}"


@dataclass(frozen=True, slots=True)
class ChangeText:
    """One changed statement in words: of what, which key, and from what to what."""

    of: str
    what: str
    before: str
    after: str


@dataclass(frozen=True, slots=True)
class PlanText:
    """One plan in words."""

    letter: str
    name: str
    note: str
    counts: dict[str, str]
    worst: str
    worst_at: str
    worst_change: str
    changes: tuple[ChangeText, ...]
    settles: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Cell:
    """A pair in one plan; `change` and `status` are against the first plan."""

    margin: str
    verdict: str
    change: str
    status: str


@dataclass(frozen=True, slots=True)
class RowText:
    """A pair of layers on one axis in every plan."""

    pair: str
    layers: tuple[str, str]
    axis: str
    cells: tuple[Cell, ...]
    is_split: bool

    @property
    def label(self) -> str:
        """The pair's name, with the layers where it stands for several of them."""
        return f"{self.pair} ({' - '.join(self.layers)})" if self.is_split else self.pair

    @property
    def moves(self) -> bool:
        """Whether any plan differs from the first."""
        return any(cell.status not in ("same", "absent") for cell in self.cells[1:])

    def fate(self, plan: int, *, short: bool = False) -> str:
        """Return what became of the pair in a plan: its verdict there, and how that came about.

        The short form leaves the verdict out.
        """
        first, cell = self.cells[0], self.cells[plan]
        if short:
            return _FATES.get(cell.status, "")
        verdict = cell.verdict or first.verdict
        if first.verdict and cell.verdict and first.verdict != cell.verdict:
            verdict = f"{first.verdict} to {cell.verdict}"
        return ", ".join(part for part in (verdict, _FATES.get(cell.status, "")) if part)


@dataclass(frozen=True, slots=True)
class ComparisonText:
    """Everything that a table or a page shows of a comparison."""

    heading: str
    unit: str
    note: str
    plans: tuple[PlanText, ...]
    rows: tuple[RowText, ...]

    @property
    def landings(self) -> str:
        """What the figures of landing pairs are; empty without any."""
        return "of a landing: contacts that fail" if any(row.axis == "xy" for row in self.rows) else ""

    @property
    def moving(self) -> tuple[RowText, ...]:
        """The rows in which any plan differs from the first."""
        return tuple(row for row in self.rows if row.moves)


def comparison_text(comparison: Comparison, notes: Sequence[str] = ()) -> ComparisonText:
    """Return a comparison in words and figures, lengths in the first plan's unit.

    Parameters
    ----------
    comparison : Comparison
        Plans side by side.
    notes : sequence of str, optional
        What each plan is about, one a plan.
    """
    base = comparison.plans[0].result.flow
    figures = Figures.fitting(base.unit, [v for row in comparison.rows for v in row.overlays if v])
    notes = notes or [""] * len(comparison.plans)
    layers: dict[str, set[tuple[str, str]]] = {}
    for row in comparison.rows:
        layers.setdefault(row.pair, set()).add(row.layers)
    said = zip(ascii_uppercase, comparison.plans, notes, strict=False)
    return ComparisonText(
        heading=base.heading,
        unit=base.unit,
        note=_judged_on(comparison),
        plans=tuple(_plan(comparison, i, *one, figures) for i, one in enumerate(said)),
        rows=tuple(_row(row, figures, len(layers[row.pair]) > 1) for row in comparison.rows),
    )


def _judged_on(comparison: Comparison) -> str:
    flows = [plan.result.flow for plan in comparison.plans]
    bases = dict.fromkeys(f"{flow.basis} basis, {flow.confidence:g} sigma" for flow in flows)
    return "each plan on its own basis: " + "; ".join(bases) if len(bases) > 1 else next(iter(bases))


def _plan(
    comparison: Comparison, index: int, letter: str, plan: Plan, note: str, figures: Figures
) -> PlanText:
    result, worst = plan.result, plan.result.worst
    first = comparison.plans[0].result
    change = ""
    if index and worst is not None and first.worst is not None:
        change = signed(figures, result.margin(worst) - first.margin(first.worst))
    return PlanText(
        letter=letter,
        name=plan.name,
        note=note,
        counts={verdict: str(count) for verdict, count in result.counts.items()},
        worst=_NONE if worst is None else figures.text(result.margin(worst)),
        worst_at="nothing is judged" if worst is None else f"{worst.pair.name}, {worst.axis}",
        worst_change=change,
        changes=_changes(plan.changes),
        settles=tuple(_label(row) for row in comparison.rows if index and row.status(index) == "settled"),
    )


def _label(row: Row) -> str:
    return f"{row.pair} ({row.axis})"


def _changes(differences: Sequence[Difference]) -> tuple[ChangeText, ...]:
    """Return the changes in words, one where both axes change alike."""
    found: list[ChangeText] = []
    for text in map(_change, differences):
        last = found[-1] if found else None
        both = text.what.removesuffix(".y")
        if last == replace(text, what=f"{both}.x") and both != text.what:
            found[-1] = replace(text, what=both)
        else:
            found.append(text)
    return tuple(found)


def _change(difference: Difference) -> ChangeText:
    of = f"{_PARTS[difference.part]} {difference.of}".strip()
    if difference.what:
        return ChangeText(of, difference.what, difference.before or _NONE, difference.after or _NONE)
    return ChangeText(of, "appears" if difference.after else "is dropped", "", "")


def signed(figures: Figures, length_nm: float) -> str:
    """Return a length with its sign, no sign for what rounds to 0."""
    text = figures.text(length_nm)
    return text if text.startswith("-") or not any(c in "123456789" for c in text) else f"+{text}"


def _row(row: Row, figures: Figures, is_split: bool) -> RowText:
    cells = []
    for plan, entry in enumerate(row.entries):
        margin, overlay, change = row.margins[plan], row.overlays[plan], None
        text = _NONE
        if margin is not None:
            text = figures.text(margin)
        elif overlay is not None:
            text = f"±{figures.text(overlay)}"
        elif isinstance(row, LandingRow) and row.fails[plan] is not None:
            text = f"{ppm(row.fails[plan])} ppm"
        status = "same"
        if plan:
            status, change = row.status(plan), row.change(plan)
        moved = "" if change is None or status == "same" else signed(figures, change)
        cells.append(Cell(text, entry.verdict if entry else "", moved, status))
    return RowText(row.pair, row.layers, row.axis, tuple(cells), is_split)


def comparison_document(comparison: Comparison, notes: Sequence[str] = ()) -> Record:
    """Return a comparison as one JSON-ready document, lengths in the first plan's unit.

    Parameters
    ----------
    comparison : Comparison
        Plans side by side.
    notes : sequence of str, optional
        What each plan is about, one a plan.
    """
    flow = comparison.plans[0].result.flow
    notes = notes or [""] * len(comparison.plans)
    return {
        "flow": flow.flow,
        "revision": flow.revision or None,
        "unit": flow.unit,
        "plans": [_plan_record(p, n, flow.unit) for p, n in zip(comparison.plans, notes, strict=True)],
        "margins": [_row_record(row, flow.unit) for row in comparison.rows],
    }


def _plan_record(plan: Plan, note: str, unit: str) -> Record:
    result, worst = plan.result, plan.result.worst
    found = None
    if worst is not None:
        margin = in_unit(result.margin(worst), unit)
        found = {"pair": worst.pair.name, "layers": list(worst.layers), "axis": worst.axis, "margin": margin}
    return {
        "name": plan.name,
        "note": note or None,
        "basis": result.flow.basis,
        "confidence": result.flow.confidence,
        "counts": dict(result.counts),
        "worst": found,
        "changes": [
            {"part": d.part, "of": d.of, "what": d.what, "before": d.before, "after": d.after}
            for d in plan.changes
        ],
    }


def _row_record(row: Row, unit: str) -> Record:
    others = range(1, len(row.entries))
    fails = (
        [finite(p * 1e6) if p is not None else None for p in row.fails]
        if isinstance(row, LandingRow)
        else None
    )
    return {
        "pair": row.pair,
        "layers": list(row.layers),
        "axis": row.axis,
        "margin": [in_unit(v, unit) for v in row.margins],
        "need": [in_unit(v, unit) for v in row.overlays],
        "verdict": list(row.verdicts()),
        "change": [None, *(in_unit(row.change(i), unit) for i in others)],
        "status": [None, *(row.status(i) for i in others)],
        **({} if fails is None else {"fail_ppm": fails}),
    }

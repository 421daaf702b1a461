"""What helps a pair, in words: short for tables, and as a sentence for a review."""

import math
from collections import Counter
from dataclasses import dataclass

from flowplan.engine.remedies.changes import Change, Redraw, Reread, Resize, SelfAlign
from flowplan.engine.remedies.result import Case, Remedies, Remedy
from flowplan.model.differences import readings_text
from flowplan.report.levertext import rounded_down
from flowplan.report.records_levers import in_own_unit, own_unit
from flowplan.report.textfigures import Figures
from flowplan.units import convert

#: Headings, and whether what stands below is a figure.
REMEDY_HEADINGS = (
    ("change", False), ("margin", True), ("verdict", False), ("worst", True), ("fail", True), ("worse", True),
)  # fmt: skip
REMEDY_LEGEND = (
    "margin, verdict: of this pair with that one change; worst, fail: worst margin",
    "of the flow and how many fail then; worse: other margins that get smaller",
)


@dataclass(frozen=True, slots=True)
class CaseText:
    """One case as text.

    Attributes
    ----------
    title, chain : str
        Which pair, how it stands, and how its layers are connected.
    rows : tuple of tuple of str
        One text a heading of `REMEDY_HEADINGS`.
    more : int
        How many changes that help as well got no row.
    sentences : tuple of str
        One a row, for a review.
    """

    title: str
    chain: str
    rows: tuple[tuple[str, ...], ...]
    more: int
    sentences: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class RemediesText:
    """Everything that a page shows of what helps."""

    unit: str
    cases: tuple[CaseText, ...]
    left_out: int


class RemedyWords:
    """Puts the remedies of one flow into words.

    Parameters
    ----------
    found : Remedies
        What `remedies` returns.
    """

    def __init__(self, found: Remedies) -> None:
        self.found = found
        self.flow = found.flow
        needs = [case.entry.need.on(self.flow.basis) for case in found.cases]
        self.figures = Figures.fitting(self.flow.unit, needs)

    def case(self, case: Case, each: int) -> CaseText:
        """Return a case as text, with the best `each` remedies of every kind."""
        shown = best_of_each(case.remedies, each)
        entry = case.entry
        return CaseText(
            f"{self._pair(case)}: margin {self.figures.with_unit(case.margin)}, {entry.verdict}",
            " - ".join(entry.chain.layers),
            tuple(self._row(remedy) for remedy in shown),
            len(case.remedies) - len(shown),
            tuple(self.sentence(case, remedy) for remedy in shown),
        )

    def sentence(self, case: Case, remedy: Remedy) -> str:
        """Return one remedy as a sentence for a review."""
        text, effect = self.figures.text, remedy.effect
        entry = case.entry
        verdict = entry.verdict if entry.verdict == remedy.verdict else f"{entry.verdict} to {remedy.verdict}"
        now = "still fails" if not remedy.is_enough and entry.verdict == "fail" else verdict
        parts = [
            f"{self.change(remedy.change)}: the margin of {self._pair(case)} goes from "
            f"{text(case.margin)} to {self.figures.with_unit(remedy.margin)} ({now})"
        ]
        if isinstance(remedy.change, Redraw | Resize):
            parts.append(self._how_far(case, remedy))
        worst = f"the worst margin of the flow is then {self.figures.with_unit(effect.worst)}"
        before = self.found.failing
        failing = f"{effect.failing} fail" + (f" instead of {before}" if before != effect.failing else "")
        parts.append(f"{worst}, {failing}")
        parts.append(self._others(effect.worse, effect.breaks))
        return "; ".join(part for part in parts if part) + "."

    def change(self, change: Change) -> str:
        """Return what is changed, in a few words."""
        if isinstance(change, Reread):
            return self._reread(change)
        if isinstance(change, SelfAlign):
            tone = ", its edges moving against that layer's" if change.tone == "opposite" else ""
            return f"Make {change.layer} self-aligned to {change.parent}{tone}"
        if isinstance(change, Redraw):
            new, old = self._up(change.after), self.figures.text(change.before)
            is_limit = next(p for p in self.flow.pairs if p.name == change.pair).rule == "overlay"
            verb = "Allow" if is_limit else "Draw"
            return f"{verb} {new} instead of {old} {self.flow.unit} along {change.axis}"
        return self._resize(change)

    def _reread(self, change: Reread) -> str:
        after, before = [readings_text(r) for r in change.after], [readings_text(r) for r in change.before]
        where = "in both axes" if len(change.axes) > 1 else f"along {change.axes[0]}"
        if len(set(before)) == 1:
            old = before[0]
        else:
            old = ", ".join(f"{name} ({axis})" for name, axis in zip(before, change.axes, strict=True))
        return f"Align {change.mask} to {after[0]} {where} instead of {old}"

    def _resize(self, change: Resize) -> str:
        quoted, unit = change.quoted, self.flow.unit
        axis = f" along {quoted.axis}" if quoted.axis else ""
        old = in_own_unit(quoted, change.before, unit) or 0.0
        if not change.after:
            return f"Remove {quoted.path}{axis}, now {old:.4g} {own_unit(quoted, unit)}"
        new = rounded_down(in_own_unit(quoted, change.after, unit) or 0.0)
        share = 100 * (1 - change.after / change.before)
        how = f"to {new:.4g} {own_unit(quoted, unit)} from {old:.4g}"
        return f"Reduce {quoted.path}{axis} {how} (-{share:.2g} %)"

    def _how_far(self, case: Case, remedy: Remedy) -> str:
        """Return what a rule or a size must become for a margin of 0, and for the reserve."""
        if not self.flow.reserve:
            return "" if remedy.for_zero is not None else self._not_enough(case)
        if remedy.for_reserve is not None:
            zero = f" ({self._size(remedy, remedy.for_zero)} leaves 0)" if remedy.for_zero is not None else ""
            return f"that also leaves the reserve{zero}"
        if remedy.for_zero is not None:
            return "that leaves 0; nothing of it would leave the reserve"
        return self._not_enough(case)

    def _not_enough(self, case: Case) -> str:
        return "not enough alone" if case.entry.verdict == "fail" else "not enough alone for the reserve"

    def _size(self, remedy: Remedy, value: float) -> str:
        if isinstance(remedy.change, Resize):
            return f"{rounded_down(in_own_unit(remedy.change.quoted, value, self.flow.unit) or 0.0):.4g}"
        return self._up(value)

    def _up(self, length_nm: float) -> str:
        """Return a length rounded up, so that what is drawn serves."""
        scale = 10.0**self.figures.decimals
        value = convert(length_nm, "nm", self.flow.unit) * scale
        return f"{math.ceil(value * (1 - 1e-12)) / scale:.{self.figures.decimals}f}"

    def _others(self, worse: int, breaks: int) -> str:
        if not worse:
            return "no other margin gets smaller"
        verb = "gets" if worse == 1 else "get"
        then = (
            f", {breaks} of them then fail{'s' if breaks == 1 else ''}"
            if breaks
            else ", none of them fails by it"
        )
        return f"{worse} other margin{'' if worse == 1 else 's'} {verb} smaller{then}"

    def _pair(self, case: Case) -> str:
        entry = case.entry
        split = f" ({' - '.join(entry.layers)})" if entry.layers != entry.pair.layers else ""
        return f"{entry.pair.name}{split} along {entry.axis}"

    def _row(self, remedy: Remedy) -> tuple[str, ...]:
        effect = remedy.effect
        change = self.change(remedy.change)
        if isinstance(remedy.change, Resize) and not remedy.is_enough:
            change += ": not enough alone"
        return (
            change,
            self.figures.text(remedy.margin),
            remedy.verdict,
            self.figures.text(effect.worst),
            str(effect.failing),
            f"{effect.worse}" if effect.worse else "",
        )


def best_of_each(remedies: tuple[Remedy, ...], each: int) -> tuple[Remedy, ...]:
    """Return the first few of every kind, in their order.

    A reading on both axes is left out where the same on one axis stands before it: for the pair it
    comes to the same.
    """
    seen: Counter[str] = Counter()
    readings: set[tuple[str, str]] = set()
    kept = []
    for remedy in remedies:
        if isinstance(remedy.change, Reread):
            same = remedy.change.mask, readings_text(remedy.change.after[0])
            if same in readings:
                continue
            readings.add(same)
        seen[remedy.kind] += 1
        if seen[remedy.kind] <= each:
            kept.append(remedy)
    return tuple(kept)

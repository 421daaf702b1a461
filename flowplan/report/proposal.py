"""The best plan of references as records for programs and as text for people."""

from dataclasses import dataclass

from flowplan.engine.analysis import Result
from flowplan.engine.compare import compare
from flowplan.engine.propose import Goal, Ladder, Proposal
from flowplan.engine.results import Verdict
from flowplan.model.base import AXES
from flowplan.model.differences import readings_text
from flowplan.report.comparison import RowText, comparison_text, signed
from flowplan.report.records import Record, entry_record, finite, in_unit
from flowplan.report.textfigures import Figures

GOAL_WORDS: dict[Goal, str] = {
    "worst": "the smallest margin as large as possible, then the next smallest",
    "fails": "as few failing pairs as possible, then the smallest margin",
    "yield": "the largest chance that every pair holds",
}
_VERDICTS: tuple[Verdict, ...] = ("pass", "tight", "fail")


@dataclass(frozen=True, slots=True)
class ChangeText:
    """What one mask reads instead; `axes` is ``x``, ``y`` or ``x y``."""

    mask: str
    axes: str
    before: str
    after: str


@dataclass(frozen=True, slots=True)
class ProposalText:
    """Everything that a table or a page shows of a proposal."""

    heading: str
    unit: str
    basis: str
    goal: str
    figures: tuple[tuple[str, str, str], ...]
    changes: tuple[ChangeText, ...]
    rows: tuple[RowText, ...]
    proof: str
    proved: bool


@dataclass(frozen=True, slots=True)
class RungText:
    """One step of a ladder: the best plan with at most so many changes."""

    changes: int
    worst: str
    gain: str
    counts: tuple[str, str, str]
    masks: str
    proved: bool
    details: tuple[ChangeText, ...]


@dataclass(frozen=True, slots=True)
class LadderText:
    """Everything that a table or a page shows of a ladder."""

    heading: str
    unit: str
    basis: str
    goal: str
    rungs: tuple[RungText, ...]
    answer: str
    proved: bool


def proposal_text(proposal: Proposal) -> ProposalText:
    """Return a proposal in words and figures, lengths in the flow's unit."""
    flow = proposal.before.flow
    figures = _figures(proposal.before)
    table = comparison_text(compare([("now", proposal.before), ("proposed", proposal.after)]))
    return ProposalText(
        heading=flow.heading,
        unit=flow.unit,
        basis=f"{flow.basis} basis, {flow.confidence:g} sigma",
        goal=GOAL_WORDS[proposal.goal],
        figures=_before_and_after(proposal, figures),
        changes=change_texts(proposal),
        rows=table.moving,
        proof=proof_words(proposal, figures),
        proved=proposal.proved,
    )


def _figures(result: Result) -> Figures:
    flow = result.flow
    return Figures.fitting(flow.unit, [e.need.on(flow.basis) for e in result.entries])


def _before_and_after(proposal: Proposal, figures: Figures) -> tuple[tuple[str, str, str], ...]:
    before, after = proposal.before, proposal.after
    rows = [
        ("worst margin", figures.text(proposal.worst_before), figures.text(proposal.worst_after)),
        ("at", _worst_at(before), _worst_at(after)),
    ]
    rows += [(verdict, str(before.counts[verdict]), str(after.counts[verdict])) for verdict in _VERDICTS]
    return tuple(rows)


def _worst_at(result: Result) -> str:
    worst = result.worst
    return "" if worst is None else f"{worst.pair.name}, {worst.axis}"


def change_texts(proposal: Proposal) -> tuple[ChangeText, ...]:
    """Return what changes, one line a mask where both axes change alike."""
    found: dict[tuple[str, str, str], list[str]] = {}
    for change in proposal.changes:
        key = change.mask, readings_text(change.before), readings_text(change.after)
        found.setdefault(key, []).append(change.axis)
    return tuple(ChangeText(key[0], " ".join(axes), *key[1:]) for key, axes in found.items())


def proof_words(proposal: Proposal, figures: Figures) -> str:
    """Return whether the plan is the best, or what no plan can exceed."""
    if proposal.proved:
        if proposal.limit is None:
            return "optimal: no choice among these references is better"
        masks = "1 mask" if proposal.limit == 1 else f"{proposal.limit} masks"
        return f"optimal: no choice that changes at most {masks} is better"
    bound = {
        "worst": f"no plan has a smallest margin above {figures.with_unit(proposal.bound)}",
        "fails": f"no plan has fewer than {proposal.bound:.0f} failing",
        "yield": f"no plan has a logarithm of yield above {proposal.bound:.6g}",
    }[proposal.goal]
    return f"best found so far, not proved: {bound}"


def ladder_text(ladder: Ladder) -> LadderText:
    """Return a ladder in words and figures, lengths in the flow's unit."""
    first = ladder.steps[0]
    flow = first.before.flow
    figures = _figures(first.before)
    return LadderText(
        heading=flow.heading,
        unit=flow.unit,
        basis=f"{flow.basis} basis, {flow.confidence:g} sigma",
        goal=GOAL_WORDS[first.goal],
        rungs=tuple(_rung(step, figures) for step in ladder.steps),
        answer=_answer(ladder),
        proved=ladder.proved,
    )


def _rung(step: Proposal, figures: Figures) -> RungText:
    passes, tight, fails = (str(step.after.counts[verdict]) for verdict in _VERDICTS)
    gain = step.worst_after - step.worst_before
    return RungText(
        changes=len(step.changed_masks) if step.limit is None else step.limit,
        worst=figures.text(step.worst_after),
        gain=signed(figures, gain) if step.changes else "",
        counts=(passes, tight, fails),
        masks=", ".join(step.changed_masks) or "the file's own plan",
        proved=step.proved,
        details=change_texts(step),
    )


def _answer(ladder: Ladder) -> str:
    if ladder.fewest is None:
        ends = "no choice among these references makes every pair pass"
        return ends if ladder.proved else "no plan was found that makes every pair pass"
    if ladder.fewest == 0:
        return "every pair passes as it is"
    masks = "1 changed mask" if ladder.fewest == 1 else f"{ladder.fewest} changed masks"
    certain = "" if ladder.fewest_proved else " (fewer may do, the search was cut short)"
    return f"{masks} and no pair fails{certain}"


def proposal_document(proposal: Proposal) -> Record:
    """Return a proposal as one JSON-ready document, lengths in the flow's unit."""
    flow = proposal.before.flow
    in_length = proposal.goal == "worst"
    return {
        "flow": flow.flow,
        "variant": flow.variant,
        "unit": flow.unit,
        "basis": flow.basis,
        "goal": proposal.goal,
        "proved": proposal.proved,
        "worst_before": in_unit(proposal.worst_before, flow.unit),
        "worst_after": in_unit(proposal.worst_after, flow.unit),
        "bound": in_unit(proposal.bound, flow.unit) if in_length else finite(proposal.bound),
        "counts_before": dict(proposal.counts_before),
        "counts_after": dict(proposal.counts_after),
        "changes": _change_records(proposal),
        "margins": [entry_record(entry, flow.unit) for entry in proposal.after.entries],
    }


def _change_records(proposal: Proposal) -> list[Record]:
    from flowplan.files.references import readings_data

    return [
        {"mask": c.mask, "axis": c.axis, "from": readings_data(c.before), "to": readings_data(c.after)}
        for c in sorted(proposal.changes, key=lambda c: AXES.index(c.axis))
    ]


def ladder_document(ladder: Ladder) -> Record:
    """Return a ladder as one JSON-ready document, lengths in the flow's unit."""
    flow = ladder.steps[0].before.flow
    return {
        "flow": flow.flow,
        "variant": flow.variant,
        "unit": flow.unit,
        "basis": flow.basis,
        "goal": ladder.steps[0].goal,
        "fewest_changes": ladder.fewest,
        "fewest_proved": ladder.fewest_proved,
        "ladder": [
            {
                "at_most": step.limit,
                "masks": list(step.changed_masks),
                "proved": step.proved,
                "worst": in_unit(step.worst_after, flow.unit),
                "counts": dict(step.counts_after),
                "changes": _change_records(step),
            }
            for step in ladder.steps
        ],
    }

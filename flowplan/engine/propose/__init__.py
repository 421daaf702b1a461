"""The best assignment of alignment references, with proof."""

import time
from collections.abc import Iterable
from dataclasses import replace

import numpy as np

from flowplan.engine.analysis import analyse
from flowplan.engine.propose.atoms import atoms_of
from flowplan.engine.propose.clock import Clock
from flowplan.engine.propose.proposal import Ladder, Progress, Proposal, ReferenceChange, Stopper, Watcher
from flowplan.engine.propose.score import GOALS, Goal, Scale
from flowplan.engine.propose.solve import Problem, Solution
from flowplan.errors import Diagnostic, UsageError, nearest
from flowplan.model.candidates import Choice, choices_of, same_readings
from flowplan.model.edits import Readings, with_references
from flowplan.model.flow import Flow

__all__ = ["GOALS", "Goal", "Ladder", "Progress", "Proposal", "ReferenceChange", "ladder", "propose"]

#: Share of a ladder's time for the unrestricted best; the other steps share the rest.
_FIRST_SHARE = 0.5


def propose(
    flow: Flow,
    *,
    goal: Goal = "worst",
    free: Iterable[str] = (),
    free_all: bool = False,
    pin: Iterable[str] = (),
    same_reference: bool = False,
    changes: int | None = None,
    time_limit: float | None = None,
    progress: Watcher | None = None,
    stop: Stopper | None = None,
    workers: int = 1,
) -> Proposal:
    """Return the best assignment of alignment references.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    goal : {'worst', 'fails', 'yield'}
        worst: the smallest margin on the flow's basis as large as possible, then the second smallest,
        and so on; fails: fewest failing pairs, then as worst; yield: the largest sum of
        log(1 - fail probability). Ties go to fewest changed masks, then to what stands first in the file.
    free : iterable of str
        Masks that may read every earlier layer, unless they carry `may_align_to`.
    free_all : bool
        Whether every mask is free in this way.
    pin : iterable of str
        Masks that keep the plan of the file.
    same_reference : bool
        Whether a mask takes x and y from one candidate.
    changes : int, optional
        Most masks that may change; a mask counts once, whichever axes change.
    time_limit : float, optional
        Seconds after which the best plan so far is returned.
    progress : callable, optional
        Told how far the search has come.
    stop : callable, optional
        Asked often; True ends the search like the time limit.
    workers : int
        From 2 on, a long search takes one axis to a second process of this interpreter, where the axes can
        be searched apart. What is found is the same.

    Returns
    -------
    Proposal
        The best plan with its proof, or the best found with what no plan exceeds.

    Raises
    ------
    UsageError
        When a named mask does not exist (FP601), no pair is judged or a number makes no sense
        (FP602), a mask is both freed and pinned (FP603), or no mask has a choice (FP604).
    """
    began = time.monotonic()
    _check(goal, changes, time_limit, workers)
    choices = choices_of(flow, free=free, free_all=free_all, pin=pin, same_reference=same_reference)
    problem = _problem(flow, choices, goal, workers)
    clock = Clock.start(goal, time_limit, progress, stop)
    found = problem.solve(clock, changes)
    return _proposal(flow, problem, goal, changes, found, began)


def ladder(
    flow: Flow,
    *,
    goal: Goal = "worst",
    free: Iterable[str] = (),
    free_all: bool = False,
    pin: Iterable[str] = (),
    same_reference: bool = False,
    time_limit: float | None = None,
    progress: Watcher | None = None,
    stop: Stopper | None = None,
    workers: int = 1,
) -> Ladder:
    """Return the best plans for 0, 1, 2, ... changed masks, up to the unrestricted best.

    Parameters
    ----------
    flow, goal, free, free_all, pin, same_reference, progress, stop, workers
        As for `propose`.
    time_limit : float, optional
        Seconds for the whole ladder.

    Returns
    -------
    Ladder
        The steps and the fewest changes with which no pair fails.

    Raises
    ------
    UsageError
        As for `propose`.
    """
    began = time.monotonic()
    _check(goal, None, time_limit, workers)
    choices = choices_of(flow, free=free, free_all=free_all, pin=pin, same_reference=same_reference)
    problem = _problem(flow, choices, goal, workers)
    clock = Clock.start(goal, time_limit, progress, stop)
    last = problem.solve(clock.part(_FIRST_SHARE))
    most = int(problem.block.changed(last.plan[None]).sum())
    steps, start = [], None
    for limit in range(most):
        found = problem.solve(clock.part(1 / (most - limit)), limit, start)
        steps.append(_proposal(flow, problem, goal, limit, found, began))
        start, began = found.plan, time.monotonic()
    final = _proposal(flow, problem, goal, None, last, began)
    if steps and not final.proved and _rank(steps[-1]) > _rank(final):
        # Cut short, the unrestricted search can be behind a step that was looked for after it.
        final = replace(steps[-1], limit=None, proved=False, bound=final.bound)
    steps.append(final)
    fewest = next((i for i, step in enumerate(steps) if not step.counts_after["fail"]), None)
    certain = fewest is None or all(step.proved for step in steps[: fewest + 1])
    return Ladder(tuple(steps), fewest, certain and goal != "yield")


def _rank(proposal: Proposal) -> list[float]:
    """Return figures by which one plan is better than another for its goal, the first that differs."""
    result = proposal.after
    margins = sorted(result.margin(e) for e in result.entries if e.margin is not None)
    reached = {"worst": [], "fails": [-proposal.best], "yield": [proposal.best]}
    return [*reached[proposal.goal], *margins]


def _check(goal: str, changes: int | None, time_limit: float | None, workers: int) -> None:
    problems = []
    if goal not in GOALS:
        problems.append(Diagnostic("FP602", f"unknown goal {goal!r}", nearest(goal, GOALS)))
    if changes is not None and changes < 0:
        problems.append(Diagnostic("FP602", f"{changes} masks cannot change", "give 0 or more"))
    if time_limit is not None and not time_limit > 0:
        problems.append(Diagnostic("FP602", f"a time limit of {time_limit:g} s", "give more than 0"))
    if workers < 1:
        problems.append(Diagnostic("FP602", f"{workers} processes cannot search", "give 1 or more"))
    if problems:
        raise UsageError(problems)


def _problem(flow: Flow, choices: tuple[Choice, ...], goal: Goal, workers: int = 1) -> Problem:
    atoms = atoms_of(flow, choices)
    largest = max((float(axis.rows.scale.max(initial=0.0)) for axis in atoms.values()), default=0.0)
    if not any(len(axis.rows.room) for axis in atoms.values()):
        hint = "add pairs with a drawn dimension or a limit"
        raise UsageError([Diagnostic("FP602", "no pair is judged, so no plan is better than another", hint)])
    return Problem(atoms, choices, Scale.of(goal, largest), workers)


def _proposal(
    flow: Flow, problem: Problem, goal: Goal, limit: int | None, found: Solution, began: float
) -> Proposal:
    changes = tuple(_changes(flow, problem.choices, found))
    planned = with_references(flow, {(c.mask, c.axis): c.after for c in changes})
    sign = -1.0 if goal == "fails" else 1.0
    return Proposal(
        goal=goal,
        limit=limit,
        proved=found.proved,
        bound=sign * float(found.bound[0]),
        before=analyse(flow),
        after=analyse(planned),
        changes=changes,
        nodes=found.nodes,
        closed=1.0 if found.proved else min(found.closed, np.nextafter(1.0, 0.0)),
        seconds=time.monotonic() - began,
    )


def _changes(flow: Flow, choices: tuple[Choice, ...], found: Solution) -> list[ReferenceChange]:
    masks = {mask.id: mask for mask in flow.masks}
    changes = []
    for choice, option in zip(choices, found.plan, strict=True):
        for axis, after in zip(choice.axes, choice.options[option], strict=True):
            before: Readings = masks[choice.mask].aligns_to.on(axis)
            if option and not same_readings(before, after):
                changes.append(ReferenceChange(choice.mask, axis, before, after))
    return changes

"""What a search for the best plan returns."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from flowplan.engine.analysis import Result
from flowplan.engine.propose.exact import log_chance
from flowplan.engine.propose.score import Goal
from flowplan.engine.results import Verdict
from flowplan.model.base import Axis
from flowplan.model.edits import Readings
from flowplan.model.flow import Flow


@dataclass(frozen=True, slots=True)
class ReferenceChange:
    """What one mask reads instead, along one axis.

    Attributes
    ----------
    mask : str
        The mask.
    axis : {'x', 'y'}
        The axis.
    before, after : tuple of Reading
        What the file has, and what the plan has.
    """

    mask: str
    axis: Axis
    before: Readings
    after: Readings


@dataclass(frozen=True, slots=True)
class Progress:
    """How far a search has come.

    Attributes
    ----------
    goal : {'worst', 'fails', 'yield'}
        What is wanted.
    best, bound : float
        What the best plan so far reaches, and what no plan exceeds: the smallest margin [nm], the
        number of failing pairs (which no plan goes below), or the sum of log(1 - fail probability).
    closed : float
        Share of the tree of plans that is settled, 0 to 1.
    nodes : int
        Nodes bounded so far.
    """

    goal: Goal
    best: float
    bound: float
    closed: float
    nodes: int


#: Told how far the search has come, a few times a second.
Watcher = Callable[[Progress], None]
#: Asked often; True ends the search with the best plan found so far.
Stopper = Callable[[], bool]


@dataclass(frozen=True, slots=True)
class Proposal:
    """The best plan, or the best found with what no plan can exceed.

    Attributes
    ----------
    goal : {'worst', 'fails', 'yield'}
        What was wanted.
    limit : int or None
        Most masks that were allowed to change.
    proved : bool
        Whether no other plan is better: by the goal, then by fewest changes, then by file order.
    bound : float
        What no plan exceeds, in the goal's figure; equal to `best` when proved.
    before, after : Result
        The margins of the plan in the file, and of this plan.
    changes : tuple of ReferenceChange
        What differs from the file, in process order, x before y.
    nodes : int
        Nodes that the search bounded.
    closed : float
        Share of the tree of plans that was settled, 0 to 1.
    seconds : float
        How long the search took.
    """

    goal: Goal
    limit: int | None
    proved: bool
    bound: float
    before: Result
    after: Result
    changes: tuple[ReferenceChange, ...]
    nodes: int
    closed: float
    seconds: float

    @property
    def flow(self) -> Flow:
        """The flow with the references of this plan."""
        return self.after.flow

    @property
    def best(self) -> float:
        """What this plan reaches, in the goal's figure; see `Progress`."""
        return figure(self.goal, self.after)

    @property
    def changed_masks(self) -> tuple[str, ...]:
        """Masks that read something else on any axis, in process order."""
        return tuple(dict.fromkeys(change.mask for change in self.changes))

    @property
    def worst_before(self) -> float:
        """The smallest margin of the plan in the file [nm]."""
        return figure("worst", self.before)

    @property
    def worst_after(self) -> float:
        """The smallest margin of this plan [nm]."""
        return figure("worst", self.after)

    @property
    def counts_before(self) -> dict[Verdict, int]:
        """Verdicts of the plan in the file."""
        return self.before.counts

    @property
    def counts_after(self) -> dict[Verdict, int]:
        """Verdicts of this plan."""
        return self.after.counts


@dataclass(frozen=True, slots=True)
class Ladder:
    """The best plan for 0, 1, 2, ... changed masks, up to the unrestricted best.

    Attributes
    ----------
    steps : tuple of Proposal
        Step n is the best plan with at most n changed masks; the last is the unrestricted best.
    fewest : int or None
        The fewest changed masks with which no pair fails; None when no plan was found that does it.
    fewest_proved : bool
        Whether `fewest` is certain.
    """

    steps: tuple[Proposal, ...]
    fewest: int | None
    fewest_proved: bool

    @property
    def proved(self) -> bool:
        """Whether every step is proved."""
        return all(step.proved for step in self.steps)


def figure(goal: Goal, result: Result) -> float:
    """Return what a plan reaches, in the goal's figure.

    Parameters
    ----------
    goal : {'worst', 'fails', 'yield'}
        What is wanted.
    result : Result
        The margins of the plan; at least one pair is judged. In the sum of logarithms a pair that is
        certain to fail counts as a chance of 1e-16 of being good, so that the sum stays finite.
    """
    judged = [e for e in result.entries if e.margin is not None]
    if goal == "fails":
        return float(sum(e.verdict == "fail" for e in judged))
    if goal == "worst":
        return min(result.margin(e) for e in judged)
    return float(log_chance(np.array([e.fail_probability for e in judged], dtype=np.float64)).sum())

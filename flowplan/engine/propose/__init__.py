"""The best assignment of alignment references, with proof."""

from collections.abc import Iterable

from flowplan.engine.propose.proposal import Ladder, Progress, Proposal, ReferenceChange, Stopper, Watcher
from flowplan.engine.propose.score import GOALS, Goal
from flowplan.model.flow import Flow

__all__ = ["GOALS", "Goal", "Ladder", "Progress", "Proposal", "ReferenceChange", "ladder", "propose"]


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
    raise NotImplementedError


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
) -> Ladder:
    """Return the best plans for 0, 1, 2, ... changed masks, up to the unrestricted best.

    Parameters
    ----------
    flow, goal, free, free_all, pin, same_reference, progress, stop
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
    raise NotImplementedError

"""When to stop, and how far the search has come."""

import time
from dataclasses import dataclass, field

from flowplan.engine.propose.proposal import Progress, Stopper, Watcher
from flowplan.engine.propose.score import Goal

#: Seconds between two reports.
_OFTEN = 0.1


@dataclass(slots=True)
class Clock:
    """Watches time, asks whether to stop and reports.

    Attributes
    ----------
    goal : {'worst', 'fails', 'yield'}
        What is wanted.
    deadline : float or None
        When to stop, on the monotonic clock [s].
    watcher, stopper : callable or None
        Told how far the search has come; asked whether to stop.
    best, bound, closed, nodes
        As in `Progress`.
    stopped : bool
        Whether the search is over.
    """

    goal: Goal
    deadline: float | None
    watcher: Watcher | None
    stopper: Stopper | None
    best: float = 0.0
    bound: float = 0.0
    closed: float = 0.0
    nodes: int = 0
    stopped: bool = False
    _last: float = field(default_factory=time.monotonic)

    @classmethod
    def start(
        cls, goal: Goal, time_limit: float | None, watcher: Watcher | None, stopper: Stopper | None
    ) -> "Clock":
        """Start now; `time_limit` in seconds."""
        deadline = None if time_limit is None else time.monotonic() + time_limit
        return cls(goal, deadline, watcher, stopper)

    def __call__(self) -> bool:
        """Report now and then; return whether to go on."""
        now = time.monotonic()
        if self.watcher is not None and now - self._last >= _OFTEN:
            self._last = now
            self.watcher(Progress(self.goal, self.best, self.bound, self.closed, self.nodes))
        if (self.deadline is not None and now >= self.deadline) or (self.stopper and self.stopper()):
            self.stopped = True
        return not self.stopped

    def part(self, share: float) -> "Clock":
        """Return a clock for a share of the time that is left; without a limit there is no end to it."""
        deadline = self.deadline
        if deadline is not None:
            now = time.monotonic()
            deadline = now + share * max(0.0, deadline - now)
        return Clock(self.goal, deadline, self.watcher, self.stopper)

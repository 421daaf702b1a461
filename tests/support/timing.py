"""Times that can be compared: both sides of a ratio take turns in one run."""

import time
from collections.abc import Callable
from typing import Any


def quickest_in_turns(rounds: int, *works: Callable[[], Any]) -> list[float]:
    """Return the least time of each work [s], every one run once a round.

    What else the machine does slows single runs, never the quickest of several by much, and taking
    turns lets it meet all works alike.
    """
    return [min(times) for times in zip(*([_seconds(w) for w in works] for _ in range(rounds)), strict=True)]


def _seconds(work: Callable[[], Any]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start

"""Blocks of work on several threads, each with a tally of its own."""

import threading
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from typing import TypeVar

Tally = TypeVar("Tally")
Progress = Callable[[int, int], None]


@contextmanager
def plain_products() -> Iterator[None]:
    """Let matrix products run on the thread that asks for them.

    The blocks already keep every processor busy; a library that spreads each small product over
    threads of its own makes them wait for each other.
    """
    from threadpoolctl import threadpool_limits

    with threadpool_limits(limits=1, user_api="blas"):
        yield


class _Blocks:
    """Hands out block numbers and counts those that are done."""

    def __init__(self, n: int, progress: Progress | None) -> None:
        self._n, self._progress = n, progress
        self._next = self._done = 0
        self._lock = threading.Lock()

    def take(self) -> int | None:
        with self._lock:
            if self._next >= self._n:
                return None
            self._next += 1
            return self._next - 1

    def finish(self) -> None:
        with self._lock:
            self._done += 1
            if self._progress:
                self._progress(self._done, self._n)

    def stop(self) -> None:
        with self._lock:
            self._next = self._n


def spread(
    n_blocks: int,
    tally: Callable[[], Tally],
    work: Callable[[Tally, int], None],
    threads: int,
    progress: Progress | None = None,
) -> list[Tally]:
    """Do blocks of work and return each thread's tally.

    Parameters
    ----------
    n_blocks : int
        Number of blocks.
    tally : callable
        Makes an empty tally.
    work : callable
        Adds one block, given by its number, to a tally. Which thread does which block is chance, so
        that tallies must add up to the same in any order: whole numbers, or places of their own.
    threads : int
        Threads at work.
    progress : callable, optional
        Called with (blocks done, blocks in all).

    Returns
    -------
    list
        The tallies, to be added up.
    """
    blocks = _Blocks(n_blocks, progress)

    def run() -> Tally:
        own = tally()
        while (block := blocks.take()) is not None:
            work(own, block)
            blocks.finish()
        return own

    if threads <= 1:
        return [run()]
    with ThreadPoolExecutor(max_workers=min(threads, max(1, n_blocks))) as pool:
        try:
            return [future.result() for future in [pool.submit(run) for _ in range(threads)]]
        finally:
            blocks.stop()

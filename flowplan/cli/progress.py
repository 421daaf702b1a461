"""A progress bar for what takes longer than a moment, on a terminal only."""

import sys
import time
from types import TracebackType
from typing import TYPE_CHECKING, Self

if TYPE_CHECKING:
    from rich.progress import Progress, TaskID

#: Shorter work shows nothing [s].
_MOMENT = 1.0


class Bar:
    """Draws how far the work is, once it takes longer than a second.

    Use it as a context manager, and hand `step` to the engine as its ``progress``.
    """

    def __init__(self, title: str) -> None:
        self._title = title
        self._begin = time.monotonic()
        self._shown: tuple[Progress, TaskID] | None = None

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._shown:
            self._shown[0].stop()

    def step(self, done: float, total: float, note: str = "") -> None:
        """Note that `done` of `total` are done, and what there is to say about it."""
        if self._shown is None and sys.stderr.isatty() and time.monotonic() - self._begin > _MOMENT:
            self._shown = self._start()
        if self._shown:
            bar, task = self._shown
            bar.update(task, completed=done, total=total, description=f"{self._title}{note}")

    def _start(self) -> "tuple[Progress, TaskID]":
        from rich.console import Console
        from rich.progress import Progress

        bar = Progress(console=Console(stderr=True), transient=True)
        bar.start()
        return bar, bar.add_task(self._title)

"""A search of one axis in a second process.

The second process is started as a program of its own and talks through pipes, so nothing of the calling
script runs twice and scripts need no guard. It begins where the search stands. It stops when its input
is closed, also when the calling process ends. Where it cannot be started, or dies, the search goes on
in this process, and finds the same.
"""

import os
import pickle
import signal
import subprocess
import sys
import threading
from dataclasses import dataclass, replace
from pathlib import Path
from typing import BinaryIO

from flowplan.engine.propose.clock import Clock
from flowplan.engine.propose.levels import Solver
from flowplan.engine.propose.prune import Best
from flowplan.engine.sources import FloatArray

#: Seconds for the second process to end once it is told to.
_PATIENCE = 10.0
_PROGRAM = "from flowplan.engine.propose.worker import serve; serve()"


@dataclass(frozen=True, slots=True)
class Report:
    """How far a search has come: its best plan, bound, share closed, nodes, and whether it is done."""

    best: Best
    bound: FloatArray
    closed: float
    nodes: int
    done: bool

    @classmethod
    def of(cls, solver: Solver) -> "Report":
        """Return how far a search has come."""
        return cls(solver.best, solver.bound, solver.closed, solver.nodes, not solver.frontier)


class Worker:
    """A search that goes on in a second process.

    Parameters
    ----------
    solver : Solver
        The search; it stays as it is here.

    Raises
    ------
    OSError
        When no process can be started.
    """

    def __init__(self, solver: Solver) -> None:
        self.report = Report.of(solver)
        bare = replace(solver, clock=Clock.start(solver.clock.goal, None, None, None), tell=_nothing)
        paths = os.pathsep.join(path or str(Path.cwd()) for path in sys.path)
        if not sys.executable:
            raise OSError("no interpreter is known")
        self._process = subprocess.Popen(  # noqa: S603 - this interpreter, our own words
            [sys.executable, "-c", _PROGRAM],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            env=os.environ | {"PYTHONPATH": paths},
        )
        self._reader = threading.Thread(target=self._listen, daemon=True)
        self._reader.start()
        if self._process.stdin is not None:
            try:
                pickle.dump(bare, self._process.stdin)
                self._process.stdin.flush()
            except OSError:
                self._process.kill()

    @property
    def running(self) -> bool:
        """Whether more can be expected."""
        return not self.report.done and self._reader.is_alive()

    def end(self) -> None:
        """Tell the process to stop, and take its last report."""
        if self._process.stdin is not None:
            try:
                self._process.stdin.close()
            except OSError:
                self._process.kill()
        self._reader.join(_PATIENCE)
        self._process.kill()
        self._process.wait()
        self._reader.join()
        if self._process.stdout is not None:
            self._process.stdout.close()

    def _listen(self) -> None:
        try:
            while self._process.stdout is not None:
                self.report = pickle.load(self._process.stdout)  # noqa: S301 - from our own process
        except (EOFError, OSError, pickle.UnpicklingError):
            return


def serve() -> None:
    """Search what comes in, and tell how far it has come, until done or until the input is closed."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    source, sink = sys.stdin.buffer, sys.stdout.buffer
    solver: Solver = pickle.load(source)  # noqa: S301 - from the process that started this one
    stop = threading.Event()
    threading.Thread(target=_wait, args=(source, stop), daemon=True).start()

    def tell() -> None:
        pickle.dump(Report.of(solver), sink)
        sink.flush()

    solver.clock.stopper, solver.tell = stop.is_set, tell
    solver.run()
    tell()
    os._exit(0)  # a thread still waits for input


def _wait(source: BinaryIO, stop: threading.Event) -> None:
    source.read()
    stop.set()


def _nothing() -> None:
    """Tell nobody."""

"""A second process finds the same, stops when told, and is not missed where it cannot be had."""

import subprocess
import sys
import time

import pytest

from flowplan.engine.propose import propose, solve, worker
from flowplan.errors import UsageError
from tests.propose.flows import large_flow
from tests.propose.test_known import chain


@pytest.fixture
def flow():
    return large_flow(5, n_masks=20, n_pairs=50)


@pytest.fixture
def at_once(monkeypatch):
    """Let a second process start at once; give back the processes that were started."""
    started = []

    class Watched(subprocess.Popen):
        def __init__(self, *args, **more):
            super().__init__(*args, **more)
            started.append(self)

    monkeypatch.setattr(solve, "_WORTH", 0.0)
    monkeypatch.setattr(worker.subprocess, "Popen", Watched)
    return started


def test_two_processes_find_what_one_finds(flow, at_once):
    alone = propose(flow)
    assert not at_once
    both = propose(flow, workers=2)
    assert len(at_once) == 1
    assert at_once[0].returncode == 0
    assert both.proved
    assert (both.changes, both.best, both.bound) == (alone.changes, alone.best, alone.bound)


@pytest.mark.parametrize("program", ["/no/such/interpreter", "", "false"])
def test_where_no_process_can_be_had_one_finds_it(flow, at_once, monkeypatch, program):
    alone = propose(flow)
    with monkeypatch.context() as patch:
        if program == "false":
            patch.setattr(worker, "_PROGRAM", "raise SystemExit(3)")
        else:
            patch.setattr(sys, "executable", program)
        found = propose(flow, workers=2)
    assert [process.returncode for process in at_once] == ([3] if program == "false" else [])
    assert found.proved
    assert (found.changes, found.nodes) == (alone.changes, alone.nodes)


def test_a_second_process_stops_with_the_first(at_once):
    flow = large_flow(1)
    told = []
    began = time.monotonic()
    found = propose(flow, workers=2, time_limit=2.0, progress=told.append)
    assert time.monotonic() - began < 12
    assert at_once[0].poll() is not None
    assert told
    assert not found.proved
    assert found.bound > found.best > found.worst_before
    assert found.bound >= 6.41  # the best of this flow, proved by a longer search


def test_a_search_needs_a_process():
    with pytest.raises(UsageError) as error:
        propose(chain(3), free_all=True, workers=0)
    assert [d.code for d in error.value.diagnostics] == ["FP602"]


def test_a_script_without_a_guard_is_run_once(tmp_path):
    script = tmp_path / "plan.py"
    script.write_text(
        "from flowplan.engine.propose import propose, solve\n"
        "from tests.propose.flows import large_flow\n"
        "solve._WORTH = 0.0\n"
        "print('found', propose(large_flow(5, n_masks=12, n_pairs=30), workers=2).proved)\n",
        encoding="utf-8",
    )
    ended = subprocess.run(
        [sys.executable, script],
        capture_output=True,
        text=True,
        timeout=60,
        check=True,
        env={"PYTHONPATH": ":".join(sys.path)},
    )
    assert ended.stdout == "found True\n"
    assert ended.stderr == ""

"""How the search scales, beside trying every plan, random plans and a greedy choice.

python -m tests.propose.benchmark 10 20 30 --seeds 3 --limit 60
"""

import argparse
import os
import statistics
import time
from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose import propose
from flowplan.engine.propose.atoms import atoms_of
from flowplan.engine.propose.block import Block
from flowplan.engine.propose.score import Scale
from flowplan.model.base import AXES
from flowplan.model.candidates import choices_of
from tests.propose.flows import large_flow

#: Seconds after which random plans are given up.
_RANDOM = 2.0


@dataclass(frozen=True)
class Outcome:
    """What one flow gave: seconds of processor time and by the wall, smallest margins, plans in all."""

    proved: bool
    seconds: float
    wall: float
    before: float
    best: float
    greedy: float
    random: float
    log10_brute_ratio: float
    nodes: int


def whole_block(flow):
    """Return both axes of a flow as one block."""
    choices = choices_of(flow)
    atoms = atoms_of(flow, choices)
    return Block(tuple(atoms[a] for a in AXES), choices, Scale.of("worst", 1.0))


def greedy(block):
    """In process order give every mask what is best for its own pairs with earlier masks."""
    plan = np.zeros(len(block.choices), dtype=np.int64)
    late = np.concatenate([block.variables[b.axis.axis][b.late - 1] for b in block.bounds])
    for variable, count in enumerate(block.count):
        mine = late == variable
        if not mine.any() or count == 1:
            continue
        plans = np.repeat(plan[None], count, axis=0)
        plans[:, variable] = np.arange(count)
        scores = np.sort(block.values(plans)[:, mine], axis=1)
        plan = plans[max(range(count), key=lambda i: (*scores[i], -i))]
    return float(block.values(plan[None]).min())


def random_plans(block, seconds, seed):
    """Return the best smallest margin among random plans judged in this time, and how many there were."""
    r = np.random.default_rng(seed)
    best, judged, began = -np.inf, 0, time.process_time()
    while judged == 0 or time.process_time() - began < seconds:
        plans = r.integers(0, block.count, (100, len(block.count)))
        best = max(best, float(block.values(plans).min(axis=1).max()))
        judged += len(plans)
    return best, judged, time.process_time() - began


def processor_time():
    """Return the seconds of this process and of those that it has waited for."""
    return sum(os.times()[:4])


def measure(n_masks, seed, limit, workers=1):
    """Run everything on one flow, random plans for as long as the search took, 2 s at most."""
    flow = large_flow(seed, n_masks=n_masks, n_pairs=round(2.5 * n_masks))
    began, clock = processor_time(), time.monotonic()
    found = propose(flow, time_limit=limit, workers=workers)
    seconds, wall = processor_time() - began, time.monotonic() - clock
    block = whole_block(flow)
    random, judged, spent = random_plans(block, min(seconds, _RANDOM), seed)
    plans = float(np.log10(block.count).sum())
    brute = plans + np.log10(spent / judged) - np.log10(seconds)
    before, best = found.worst_before, found.worst_after
    return Outcome(found.proved, seconds, wall, before, best, greedy(block), random, brute, found.nodes)


def main():
    """Print a table, medians and the worst over the seeds."""
    parser = argparse.ArgumentParser()
    parser.add_argument("masks", type=int, nargs="+")
    parser.add_argument("--seeds", type=int, default=3)
    parser.add_argument("--limit", type=float, default=60.0)
    parser.add_argument("--workers", type=int, default=1)
    asked = parser.parse_args()
    print("masks  proved  s median  s worst  wall worst  brute/search  before  random  greedy    best")  # noqa: T201
    for n in asked.masks:
        runs = [measure(n, seed, asked.limit, asked.workers) for seed in range(1, asked.seeds + 1)]

        def mid(name, runs=runs):
            return statistics.median(getattr(run, name) for run in runs)

        proved = f"{sum(run.proved for run in runs)}/{len(runs)}"
        worst, wall = max(run.seconds for run in runs), max(run.wall for run in runs)
        brute = f"1e{mid('log10_brute_ratio'):.0f}"
        line = f"{n:5}  {proved:>6}  {mid('seconds'):8.2f}  {worst:7.2f}  {wall:10.2f}  {brute:>12}"
        line += "".join(f"  {mid(name):6.2f}" for name in ("before", "random", "greedy", "best"))
        print(line, flush=True)  # noqa: T201


if __name__ == "__main__":
    main()

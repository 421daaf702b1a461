"""Every figure of a remedy is what the engine gives for the edited flow."""

from pathlib import Path

import pytest

import flowplan
from flowplan.engine.analysis import analyse
from flowplan.engine.remedies import remedies
from flowplan.engine.remedies.changes import Change, apply
from flowplan.engine.remedies.result import KINDS
from flowplan.model.check import check
from flowplan.model.flow import Flow
from flowplan.report.remedytext import best_of_each
from tests.propose.flows import small_flow

FLOWS = Path(__file__).resolve().parents[2] / "flows"
#: How many of each kind are tried in each case of an example.
EXAMPLES = {
    "cmos": 2, "ebeam_transistor": 2, "photonic": 9, "pressure_sensor": 1, "redistribution": 1,
    "logic_backend": 1,
}  # fmt: skip
Key = tuple[str, str, str, str]


def margins_of(flow: Flow) -> dict[Key, tuple[float, str, float]]:
    """Margin, verdict and drawn value of every judged entry."""
    result = analyse(flow)
    return {
        (e.pair.name, *e.layers, e.axis): (result.margin(e), e.verdict, e.drawn)
        for e in result.entries
        if e.margin is not None
    }


def assert_true(flow: Flow, each: int) -> set[str]:
    """Check the best of each kind; returns the kinds that were seen."""
    before = margins_of(flow)
    edited: dict[str, dict[Key, tuple[float, str, float]]] = {}
    kinds = set()
    for case in remedies(flow).cases:
        key = (case.entry.pair.name, *case.entry.layers, case.entry.axis)
        assert case.margin == pytest.approx(before[key][0], abs=1e-9)
        for remedy in best_of_each(case.remedies, each):
            after = edited.get(repr(remedy.change)) or _margins_after(flow, remedy.change)
            edited[repr(remedy.change)] = after
            margin, verdict, drawn = after[key]
            assert remedy.margin == pytest.approx(margin, abs=1e-9 * drawn), remedy
            assert remedy.verdict == verdict, remedy
            assert remedy.margin > case.margin
            effect = remedy.effect
            assert effect.worst == pytest.approx(min(m for m, _, _ in after.values()), abs=1e-9 * drawn)
            assert effect.failing == sum(v == "fail" for _, v, _ in after.values()), remedy
            worse = [k for k, (m, _, d) in before.items() if after[k][0] < m - 1e-9 * d]
            assert effect.worse == len(worse), remedy
            broken = [k for k in worse if after[k][1] == "fail" and before[k][1] != "fail"]
            assert effect.breaks == len(broken), remedy
            kinds.add(remedy.kind)
    return kinds


def _margins_after(flow: Flow, change: Change) -> dict[Key, tuple[float, str, float]]:
    changed = apply(flow, change)
    assert [d for d in check(changed) if d.severity == "error"] == []
    return margins_of(changed)


@pytest.mark.parametrize("name", EXAMPLES)
def test_example_flow(name):
    assert {"self-align", "rule", "size"} <= assert_true(
        flowplan.load(FLOWS / f"{name}.yaml"), EXAMPLES[name]
    )


def test_random_flows():
    """Shared sources, averages, bounds, offsets, shapes, features, candidates, all three bases."""
    kinds = set().union(*(assert_true(small_flow(seed), 99) for seed in range(14)))
    assert kinds == set(KINDS)

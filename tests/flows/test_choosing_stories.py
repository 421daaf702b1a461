"""What the variants and the other references of the example flows tell."""

from functools import cache
from math import sqrt
from pathlib import Path

import pytest

from flowplan.engine.analysis import analyse
from flowplan.engine.compare import Comparison, Row, compare
from flowplan.engine.propose import ladder
from flowplan.files.reader import load_with_warnings

FLOWS = Path(__file__).resolve().parents[2] / "flows"


@cache
def compared(name: str) -> tuple[Comparison, list[str]]:
    loaded = load_with_warnings(FLOWS / f"{name}.yaml")
    plans = {"own": loaded.flow, **loaded.variants}
    return compare([(n, analyse(flow)) for n, flow in plans.items()]), list(plans)


def row(comparison: Comparison, pair: str, axis: str, layers: tuple[str, str] | None = None) -> Row:
    (found,) = [r for r in comparison.rows if (r.pair, r.axis) == (pair, axis) and layers in (None, r.layers)]
    return found


class TestSelfAlignedAgainstMasked:
    """cmos: what the self-aligned gate saves."""

    flow = "cmos"

    def test_a_masked_drain_lies_two_readings_from_the_gate_where_it_had_no_error(self):
        comparison, names = compared(self.flow)
        masked = names.index("masked source and drain")
        drain = row(comparison, "drain on gate", "x")
        assert drain.status(masked) == "unsettled"
        assert drain.entries[0].overlay.random == 0
        # Gate and drain each read ACTIVE (80) on one stage (45); that alone is sqrt(2 (80^2 + 45^2)).
        assert drain.entries[masked].overlay.random > sqrt(2 * (80**2 + 45**2))
        assert drain.verdicts()[masked] == "fail"

    def test_contact_to_active_moves_room_from_the_gate_to_the_active_area(self):
        comparison, names = compared(self.flow)
        active = names.index("contact to active")
        assert row(comparison, "contact inside active", "x").verdicts()[active] == "pass"
        assert row(comparison, "contact clear of gate", "x").verdicts()[active] == "fail"
        assert row(comparison, "contact inside active", "y").status(active) == "same"


class TestAveragedReferences:
    """logic_backend: what reading both halves of a split metal is worth."""

    flow = "logic_backend"

    def test_a_via_that_reads_one_half_gives_room_to_it_and_takes_it_from_the_other(self):
        comparison, names = compared(self.flow)
        one = names.index("vias read one half")
        changes = {
            half: row(comparison, "V0 inside M0", "y", (half, "V0A")).change(one) for half in ("M0A", "M0B")
        }
        assert changes["M0A"] > 0 > changes["M0B"]
        tight = row(comparison, "V0 inside M1", "x", ("M1B", "V0B"))
        assert tight.change(one) < 0

    def test_one_level_that_skips_one_makes_every_pair_pass(self):
        comparison, names = compared(self.flow)
        skip = names.index("metal 8 skips a level")
        assert comparison.plans[0].result.counts["fail"] == 1
        assert comparison.plans[skip].result.counts["fail"] == 0


def test_the_search_finds_that_one_change_is_enough_and_proves_it():
    flow = load_with_warnings(FLOWS / "logic_backend.yaml").flow
    found = ladder(flow)
    assert (found.fewest, found.fewest_proved, found.proved) == (1, True, True)
    assert found.steps[0].counts_after["fail"] == 1
    assert found.steps[1].counts_after["fail"] == 0
    assert found.steps[1].changed_masks == ("M8",)
    again = analyse(found.steps[-1].flow)
    assert again.margin(again.worst) == pytest.approx(found.steps[-1].worst_after, rel=1e-12)

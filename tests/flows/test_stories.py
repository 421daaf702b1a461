"""The stories that the example flows tell, each with its arithmetic worked out by hand beside it.

Numbers are those of the flow files, in their unit; a root-sum-square is written out term by term. A
changed flow must change its story here as well.
"""

from math import hypot, sqrt
from pathlib import Path

import numpy as np
import pytest

import flowplan
from flowplan.model.flow import Flow
from tests.support.flows import entry

FLOWS = Path(__file__).resolve().parents[2] / "flows"


def rss(*terms: float) -> float:
    return sqrt(sum(t * t for t in terms))


@pytest.fixture(scope="module")
def results():
    """Each flow, analysed when a story first asks for it."""

    class Results(dict):
        def __missing__(self, name):
            self[name] = flowplan.analyse(flowplan.load(FLOWS / f"{name}.yaml")).result
            return self[name]

    return Results()


def realigned(flow: Flow, mask: str, aligns_to: object) -> Flow:
    """Return the flow with one mask aligned to something else."""
    data = flow.model_dump(exclude_none=True)
    (changed,) = [m for m in data["masks"] if m["id"] == mask]
    changed["aligns_to"] = aligns_to
    return Flow.model_validate(data)


def contribution(found, name: str, of: str) -> float:
    (row,) = [s for s in found.sources if (s.source.name, s.source.of) == (name, of)]
    return row.contribution


class TestFailsOnlyThroughAnIndirectChain:
    """cmos: contact inside active."""

    def test_it_fails_along_x_by_way_of_the_gate(self, results):
        found = entry(results["cmos"], "contact inside active", "x")
        assert found.chain.layers == ("ACTIVE", "GATE", "CONTACT")
        overlay = rss(
            80, 80, 45,  # two readings, the second of rough gate marks
            45, 45,  # stage, twice
            sqrt(0.2) * 50, sqrt(0.2) * 50,  # what does not repeat of the lens, on both layers
            2.5 * 7.5, 2.5 * 7.5,  # field rotation, both layers, at the field's edge
            sqrt(0.5) * 2 * 7.5, sqrt(0.5) * 2 * 7.5,  # magnification that does not repeat, both layers
            0.3 * 67.5, 0.3 * 67.5,  # wafer scale of GATE and CONTACT
            0.2 * 7.5, 0.2 * 7.5,  # wafer skew of both
        )  # fmt: skip
        assert found.overlay.random == pytest.approx(overlay, rel=1e-12)
        edges = hypot(80 / 2, 80 / 2)
        margin = 235 - 120 / 2 - 30 / 2 - 15 - hypot(overlay, edges)
        assert found.margin.mixed == pytest.approx(margin, rel=1e-12)
        assert (found.verdict, margin < 0) == ("fail", True)

    def test_it_passes_along_y_where_contact_reads_active(self, results):
        found = entry(results["cmos"], "contact inside active", "y")
        assert found.chain.layers == ("ACTIVE", "CONTACT")
        assert found.verdict == "pass"

    def test_it_would_pass_along_x_if_aligned_directly_at_the_cost_of_the_gate(self, results):
        direct = flowplan.analyse(realigned(results["cmos"].flow, "CONTACT", "ACTIVE")).result
        assert entry(direct, "contact inside active", "x").verdict == "pass"
        assert entry(direct, "contact clear of gate", "x").verdict == "fail"
        assert entry(results["cmos"], "contact clear of gate", "x").verdict == "tight"


class TestSettledByASelfAlignedFeature:
    """cmos: drain and gate; logic_backend: via in the trench of its metal."""

    def test_gate_to_drain_has_exactly_no_overlay_error(self, results):
        found = entry(results["cmos"], "drain on gate", "x")
        assert (found.overlay.offset, found.overlay.bound, found.overlay.random) == (0, 0, 0)
        assert found.sources == ()
        assert found.margin.linear == 30

    def test_only_the_implants_own_edge_is_left_of_the_overlap(self, results):
        """The gate's 70 nm of CD enter once as they are and once with the sign turned."""
        found = entry(results["cmos"], "extension under gate", "x")
        assert [(s.source.name, s.contribution) for s in found.sources] == [("edge", 12.0)]
        assert found.margin.mixed == 60 - 20 - 12

    def test_along_the_gate_the_drain_does_not_follow_it(self, results):
        """Along y the edge of the active area limits the drain; its place is that of ACTIVE."""
        graph = results["cmos"].engine.graph
        assert graph.chain(first="GATE", second="SD", axis="y").layers == ("GATE", "ACTIVE", "SD")

    def test_a_via_etched_through_its_trench_cannot_miss_the_metal(self, results):
        found = entry(results["logic_backend"], "V4E inside M5", "x")
        assert found.need.linear == 0
        assert found.cpk == float("inf")
        assert entry(results["logic_backend"], "V4E over M4", "y").need.linear > 0


class TestChainRssTooLarge:
    """photonic: gap between the two junction implants, siblings on the waveguide."""

    def test_true_error_has_what_does_not_repeat(self, results):
        found = entry(results["photonic"], "gap between n and p", "x")
        own = (7, 4, sqrt(0.05) * 14, 0.2 * 11, 0.2 * 11, 0.03 * 77, 0.02 * 55)
        assert found.overlay.random == pytest.approx(sqrt(2) * rss(*own), rel=1e-12)

    def test_each_hop_has_both_lenses_and_the_waveguides_mask(self, results):
        found = entry(results["photonic"], "gap between n and p", "x")
        hop = (7, 4, 14, 0.2 * 11, 0.2 * 11, 0.03 * 77, 0.02 * 55, 9, 7)
        assert found.chain_rss == pytest.approx(sqrt(2) * rss(*hop), rel=1e-12)

    def test_the_hand_calculation_says_more_than_double_and_fails_the_pair(self, results):
        found = entry(results["photonic"], "gap between n and p", "x")
        assert found.chain_rss > 2 * found.overlay.random
        by_hand = 50 - 20 - hypot(found.chain_rss, hypot(16 / 2, 16 / 2))
        assert by_hand < 0.1 * 50 < found.margin.mixed


class TestChainRssTooSmall:
    """logic_backend: M5 to M9, eight exposures in series with one baseline error."""

    def test_common_baseline_adds_up_eight_times(self, results):
        found = entry(results["logic_backend"], "shield M9 over M5", "x")
        assert len(found.chain.hops()) == 8
        assert abs(contribution(found, "baseline", "immersion")) == pytest.approx(8 * sqrt(0.9) * 1.1)

    def test_true_error(self, results):
        found = entry(results["logic_backend"], "shield M9 over M5", "x")
        each = (1.2, 0.6, sqrt(0.1) * 1.1, 0.02 * 16.5, 0.02 * 13, 0.003 * 143)
        expected = rss(sqrt(8) * rss(*each), 8 * sqrt(0.9) * 1.1, 0.3, 1.0, 0.9)
        assert found.overlay.random == pytest.approx(expected, rel=1e-12)

    def test_hop_by_hop(self, results):
        found = entry(results["logic_backend"], "shield M9 over M5", "x")
        each = rss(1.2, 0.6, 1.1, 0.02 * 16.5, 0.02 * 13, 0.003 * 143)
        first = rss(each, 0.3, 1.0, 0.9)  # marks of M5, and one lens against another
        later = rss(each, sqrt(2 * 0.15) * 1.0)  # the same lens twice
        assert found.chain_rss == pytest.approx(rss(first, sqrt(7) * later), rel=1e-12)

    def test_the_hand_calculation_passes_what_fails(self, results):
        found = entry(results["logic_backend"], "shield M9 over M5", "x")
        assert found.verdict == "fail"
        assert 8 - 0.3 - found.chain_rss > 0.1 * 8

    def test_reading_metal_6_instead_would_hold(self, results):
        """The remedy in the pair's notes: five exposures in series instead of eight."""
        better = flowplan.analyse(realigned(results["logic_backend"].flow, "M8", "M6")).result
        found = entry(better, "shield M9 over M5", "x")
        assert len(found.chain.hops()) == 5
        assert found.verdict == "pass"


class TestLimitedByTheWafersEdge:
    """redistribution: opening on stud."""

    def test_the_worst_point_is_as_far_out_as_a_field_reaches(self, results):
        result = results["redistribution"]
        found = entry(result, "opening on stud", "x")
        reach = np.abs(result.engine.sites.basis[3])
        assert abs(found.point.X + found.point.x) == reach.max() == 133

    def test_arithmetic_there(self, results):
        found = entry(results["redistribution"], "opening on stud", "x")
        offset = 8e-3 * 133 + 0.5 / 2
        bound = 1.2 + 3e-3 * 133
        random = rss(
            3, 0.25 * 7, 12e-3 * 133,  # placing, die turn, mould shrinkage
            0.5, 0.3, 0.25, 2e-3 * 133, 8e-3 * 7,  # the stepper's reading, stage, lens, scale, rotation
            1.5 / 2, 0.3,  # edges of opening and stud
        )  # fmt: skip
        assert found.residual.random / 1e3 == pytest.approx(random, rel=1e-12)
        assert found.margin.mixed / 1e3 == pytest.approx(6.5 - offset - bound - random, rel=1e-9)
        assert found.verdict == "fail"

    def test_the_centre_of_the_wafer_has_room(self, results):
        result = results["redistribution"]
        found = entry(result, "opening on stud", "x")
        over_sites = result.engine.margin_map([found])[0]
        inner = np.hypot(*result.engine.sites.positions[:, :2].T) < 50
        assert over_sites[inner].min() > 0.1 * 6500 > 0 > over_sites.min()

    def test_correcting_the_known_part_would_hold(self, results):
        """The remedy in the pair's notes."""
        data = results["redistribution"].flow.model_dump(exclude_none=True)
        del data["tools"]["placer"]["terms"]["mould shrinkage"]["offset"]
        better = flowplan.analyse(Flow.model_validate(data)).result
        assert entry(better, "opening on stud", "x").verdict == "pass"

    def test_above_the_dies_their_errors_cancel(self, results):
        """The chain from carrier to ball pad runs through DIE, whose pattern moves neither of them."""
        found = entry(results["redistribution"], "ball pad on carrier", "x")
        assert "DIE" in found.chain.layers
        assert {s.source.name for s in found.sources}.isdisjoint({"placing", "mould shrinkage", "mould flow"})
        assert found.chain_rss > 2 * found.overlay.random


class TestFewDies:
    """redistribution: the first opening aligned by a fit to twelve dies instead of very many."""

    def test_the_opening_loses_what_twelve_dies_cannot_average(self, results):
        """By hand on a ring: shift 3.1 um / sqrt(12), rotation the same over 110 mm, times y at the point."""
        name = "opening on stud"
        many = entry(results["redistribution"], name, "x")
        few = entry(
            flowplan.analyse(flowplan.load(FLOWS / "redistribution.yaml", "twelve dies read")).result,
            name,
            "x",
        )
        assert (abs(few.point.X + few.point.x), abs(few.point.Y + few.point.y)) == (133, 49)
        gain = rss(3.1 / sqrt(12), 3.1 / (110 * sqrt(12)) * 49) ** 2 - 0.5**2
        assert (few.residual.random / 1e3) ** 2 - (many.residual.random / 1e3) ** 2 == pytest.approx(
            gain, rel=1e-9
        )
        assert few.margin.mixed < many.margin.mixed < 0


class TestBackSideMirrored:
    """pressure_sensor: the camera offset of the cavity mask; SEMI M20-1104, 6.2: x reverses, y stays."""

    def test_offset_is_mirrored_in_x_alone(self, results):
        """Quoted as (1.5, 0.8) um by the aligner; seen from the front (-1.5, 0.8)."""
        pair = "membrane under resistors"
        offsets = [entry(results["pressure_sensor"], pair, axis).overlay.offset for axis in "xy"]
        assert offsets == [pytest.approx(-1500), pytest.approx(800)]

    def test_on_the_front_it_would_not_be(self, results):
        data = results["pressure_sensor"].flow.model_dump(exclude_none=True)
        (cavity,) = [m for m in data["masks"] if m["id"] == "CAVITY"]
        cavity["side"] = "front"
        front = flowplan.analyse(Flow.model_validate(data)).result
        offsets = [entry(front, "membrane under resistors", axis).overlay.offset for axis in "xy"]
        assert offsets == [pytest.approx(1500), pytest.approx(800)]

    def test_membrane_keeps_the_cavitys_place(self, results):
        """Same offset for the etched membrane; its own etch adds 1.75 um of bound to the camera's 0.5."""
        found = entry(results["pressure_sensor"], "resistor inside membrane edge", "x")
        assert found.residual.offset == pytest.approx(-1500)
        assert found.residual.bound == pytest.approx(1750 + 500)


class TestSharedSource:
    """pressure_sensor: one temperature stretches all front masks alike."""

    def test_run_out_cancels_between_front_masks(self, results):
        found = entry(results["pressure_sensor"], "metal clear of resistor", "x")
        assert "mask temperature" not in {s.source.name for s in found.sources}
        own = [s.contribution for s in found.sources if s.source.name == "run-out"]
        place = abs(found.point.X + found.point.x)
        assert [abs(c) for c in own] == pytest.approx([sqrt(0.2) * 3.2 * place] * 2)

    def test_and_stays_against_the_back(self, results):
        found = entry(results["pressure_sensor"], "membrane under resistors", "x")
        place = abs(found.point.X + found.point.x)
        shared = contribution(found, "mask temperature", "shared source")
        assert abs(shared) == pytest.approx(sqrt(0.8) * 3.2 * place)


class TestAveragedReferences:
    """ebeam_transistor: the head over the foot; logic_backend: vias on split metal."""

    def test_the_head_shares_half_of_its_reference_with_the_foot(self, results):
        found = entry(results["ebeam_transistor"], "head over foot", "x")
        metal_to_primary = rss(60, 6, 30, 0.8 * 35)  # reading, stage and scale of the ohmic mask
        expected = rss(
            metal_to_primary / 2,
            16, 14,  # the foot's reading of rough metal
            16 / 2, 14 / 2, 12 / 2, 6 / 2,  # the head's two readings, averaged
            sqrt(2) * rss(10, 3 * 6 / sqrt(3), 1 * 5, 1 * 5),  # the writer, twice
        )  # fmt: skip
        assert found.overlay.random == pytest.approx(expected, rel=1e-12)
        assert found.overlay.bound == pytest.approx(8 / 2)
        assert found.chain_rss is None
        assert found.chain.one_of_several
        assert found.verdict == "fail"

    def test_reading_what_the_foot_reads_would_hold(self, results):
        """The remedy in the pair's notes."""
        same = {"x": [{"mask": "OHMIC", "alignment": 16}], "y": "PRIMARY"}
        better = flowplan.analyse(realigned(results["ebeam_transistor"].flow, "HEAD", same)).result
        found = entry(better, "head over foot", "x")
        drift = 3 * 6 / sqrt(3)
        assert found.overlay.random == pytest.approx(sqrt(2) * rss(16, 14, 10, drift, 5, 5), rel=1e-12)
        assert {found.verdict, entry(better, "head over foot", "y").verdict} <= {"pass", "tight"}

    def test_a_via_lies_nearer_to_the_second_half_of_its_metal(self, results):
        """V = (A + B) / 2 + b with B = A + b: one and a half baselines from A, half of one from B."""
        pairs = [e for e in results["logic_backend"].entries if e.pair.name == "V0 inside M0"]
        found = {e.layers: contribution(e, "baseline", "immersion") for e in pairs}
        baseline = sqrt(0.9) * 1.1
        assert abs(found["M0A", "V0A"]) == pytest.approx(1.5 * baseline)
        assert abs(found["M0B", "V0A"]) == pytest.approx(0.5 * baseline)


@pytest.mark.parametrize(
    ("name", "failing"),
    [
        ("cmos", {"contact inside active"}),
        ("ebeam_transistor", {"head over foot"}),
        ("logic_backend", {"shield M9 over M5"}),
        ("photonic", {"heater centred on strip"}),
        ("pressure_sensor", {"opening inside metal pad"}),
        ("redistribution", {"opening on stud"}),
    ],
)
def test_one_pair_of_each_flow_fails_and_its_notes_say_what_to_do(results, name, failing):
    result = results[name]
    found = [e for e in result.entries if e.verdict == "fail"]
    assert {e.pair.name for e in found} == failing
    assert all(e.pair.notes for e in found)
    assert result.worst in found
    assert result.counts["pass"] > 0.7 * len(result.entries)


def test_the_heaters_trouble_is_two_lenses_not_the_chain(results):
    """photonic: the pair's notes say that reading the strip itself would gain some 2 nm and still fail."""
    direct = flowplan.analyse(realigned(results["photonic"].flow, "HEATER", "STRIP")).result
    before = entry(results["photonic"], "heater centred on strip", "x")
    after = entry(direct, "heater centred on strip", "x")
    assert 1.5 < before.overlay.random - after.overlay.random < 2.5
    assert (before.verdict, after.verdict) == ("fail", "fail")


def test_a_wider_metal_pad_would_hold(results):
    """pressure_sensor: the pair's notes ask for 3.5 um."""
    data = results["pressure_sensor"].flow.model_dump(exclude_none=True)
    (pair,) = [p for p in data["pairs"] if p["name"] == "opening inside metal pad"]
    pair["drawn"] = 3.5
    better = flowplan.analyse(Flow.model_validate(data)).result
    assert {entry(better, "opening inside metal pad", axis).verdict for axis in "xy"} <= {"pass", "tight"}

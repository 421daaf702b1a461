"""The engine's front: rows in file order, counts, the worst entry, every pair, and maps over the wafer."""

import math

import numpy as np
import pytest

from flowplan.engine.analysis import Engine, analyse, every_pair
from tests.support.flows import bare_flow, entry, flow_of, mask, overlay_pair

GEOMETRY = {"wafer": {"diameter": "60 mm"}, "field": {"x": "10 mm", "y": "10 mm"}}


def flow(pairs, **more):
    """A random shift of 3 and 4 nm: B on A has 3 at one sigma, C on A 4, C on B 5."""
    masks = [mask("A"), mask("B", "A", terms={"t": 3}), mask("C", "A", terms={"t": 4})]
    return flow_of(bare_flow(masks, pairs, **more))


class TestOrder:
    def test_entries_stand_in_file_order_x_before_y(self):
        pairs = [
            overlay_pair("A", "C", axes="y"),
            overlay_pair("M", "A"),
            overlay_pair("A", "B", axes="x"),
        ]
        result = analyse(flow(pairs, split_layers={"M": ["C", "B"]}))
        assert [(e.layers, e.axis) for e in result.entries] == [
            (("A", "C"), "y"),
            (("C", "A"), "x"),
            (("C", "A"), "y"),
            (("B", "A"), "x"),
            (("B", "A"), "y"),
            (("A", "B"), "x"),
        ]

    def test_more_pairs_than_one_batch(self):
        """520 pairs on one axis, every third on C: the order survives the batches."""
        pairs = [
            overlay_pair("A", "C" if i % 3 == 0 else "B", axes="x") | {"name": f"p{i}"} for i in range(520)
        ]
        result = analyse(flow(pairs))
        assert [e.pair.name for e in result.entries] == [f"p{i}" for i in range(520)]
        expected = [4.0 if i % 3 == 0 else 3.0 for i in range(520)]
        assert [e.overlay.random for e in result.entries] == pytest.approx(expected)

    def test_a_flow_without_pairs_has_no_entries(self):
        result = analyse(flow([]))
        assert (result.entries, result.worst) == ((), None)
        assert set(result.counts.values()) == {0}

    def test_progress_counts_rows_up_to_all(self):
        seen = []
        analyse(
            flow([overlay_pair("A", "B"), overlay_pair("A", "C", axes="y")]),
            progress=lambda *a: seen.append(a),
        )
        assert seen == [(1, 3), (3, 3)]

    def test_other_pairs_may_be_asked(self):
        one = flow([overlay_pair("A", "B")])
        result = analyse(one, pairs=every_pair(one))
        assert [e.layers for e in result.entries if e.axis == "x"] == [("A", "B"), ("A", "C"), ("B", "C")]
        assert entry(result, "C on B").overlay.random == pytest.approx(5)


class TestEveryPair:
    def test_is_every_two_layers_in_process_order_without_a_limit(self):
        found = every_pair(flow([], self_aligned=[{"id": "S", "follows": "B"}]))
        assert [p.between for p in found] == [
            ("A", "B"), ("A", "S"), ("A", "C"), ("B", "S"), ("B", "C"), ("S", "C"),
        ]  # fmt: skip
        assert {p.limit for p in found} == {None}
        assert found[0].name == "B on A"


class TestVerdicts:
    PAIRS = (
        overlay_pair("A", "B", limit=3.5, axes="x"),  # margin 0.5
        overlay_pair("A", "C", limit=4.2, axes="x"),  # 0.2, below a tenth of the limit
        overlay_pair("B", "C", limit=4, axes="x"),  # -1
        overlay_pair("C", "A", axes="x"),
    )

    @pytest.fixture
    def result(self):
        return analyse(flow(list(self.PAIRS), reserve=0.1))

    def test_counts(self, result):
        assert result.counts == {"pass": 1, "tight": 1, "fail": 1, "unjudged": 1}

    def test_worst_is_the_smallest_margin(self, result):
        assert result.worst.layers == ("B", "C")

    def test_the_first_counts_on_a_tie(self):
        pairs = [overlay_pair("A", "B", limit=4) | {"name": name} for name in ("one", "two")]
        assert analyse(flow(pairs)).worst.pair.name == "one"

    def test_worst_goes_by_the_flows_basis(self):
        """mixed: 9 - (4 + 3) = 2 and 8.5 - 6 = 2.5; rss: 9 - 5 = 4 and 8.5 - 6 = 2.5."""
        masks = [
            mask("A"),
            mask("B", "A", terms={"t": {"random": 3, "bound": 4}}),
            mask("C", "A", terms={"t": 6}),
        ]
        pairs = [overlay_pair("A", "B", limit=9, axes="x"), overlay_pair("A", "C", limit=8.5, axes="x")]
        worst = {
            basis: analyse(flow_of(bare_flow(masks, pairs, basis=basis))).worst.layers
            for basis in ("mixed", "rss", "linear")
        }
        assert worst == {"mixed": ("A", "B"), "rss": ("A", "C"), "linear": ("A", "B")}

    def test_margin_is_on_the_flows_basis_and_nan_where_nothing_is_judged(self, result):
        margins = [result.margin(e) for e in result.entries]
        assert margins[:3] == pytest.approx([0.5, 0.2, -1])
        assert math.isnan(margins[3])


class TestMarginMap:
    """B turns by 1 urad over the wafer against A: along x the error is 1 nm per mm of |Y|."""

    @pytest.fixture
    def engine(self):
        turn = {"turn": {"random": "1 urad", "shape": "rotation", "over": "wafer"}}
        pairs = [overlay_pair("A", "B", limit=100), overlay_pair("B", "A")]
        return Engine.of(flow_of(bare_flow([mask("A"), mask("B", "A", terms=turn)], pairs, **GEOMETRY)))

    def test_margin_at_every_site(self, engine):
        entries = [e for e in engine.entries() if e.axis == "x"]
        found = engine.margin_map(entries)
        Y = np.abs(engine.sites.basis[4])
        assert found.shape == (2, engine.sites.n_points)
        assert found[0] == pytest.approx(100 - Y)
        assert found[1] == pytest.approx(-Y)  # without a limit, minus the error

    def test_its_minimum_is_the_entrys_margin_at_its_point(self, engine):
        one = entry(analyse(engine.flow), "A-B", "y")
        found = engine.margin_map([one])[0]
        assert found.min() == pytest.approx(one.margin.mixed)
        assert engine.sites.point(int(found.argmin())) == one.point

    def test_of_nothing_has_no_rows(self, engine):
        assert engine.margin_map([]).shape == (0, engine.sites.n_points)

    def test_entries_of_two_axes_are_refused(self, engine):
        with pytest.raises(ValueError, match="one axis"):
            engine.margin_map(engine.entries())


class TestBudget:
    def test_sources_are_sorted_by_share_then_amount_and_shares_add_up(self):
        terms = {"small": 1, "large": 4, "worst": {"bound": 9}, "known": {"offset": -2}}
        masks = [mask("A"), mask("B", "A", terms=terms)]
        found = entry(analyse(flow_of(bare_flow(masks, [overlay_pair("A", "B")]))), "A-B")
        rows = found.sources
        assert [r.source.name for r in rows] == ["large", "small", "worst", "known"]
        assert [r.share for r in rows] == pytest.approx([16 / 17, 1 / 17, 0, 0])
        assert [abs(r.contribution) for r in rows] == [4, 1, 9, 2]
        assert all(r.contribution == r.coefficient * r.source.size for r in rows)

    def test_without_variation_no_share_is_given(self):
        masks = [mask("A"), mask("B", "A", terms={"t": {"bound": 9}})]
        found = entry(analyse(flow_of(bare_flow(masks, [overlay_pair("A", "B")]))), "A-B")
        assert [r.share for r in found.sources] == [0]


def test_an_axis_on_which_nothing_ever_moves_has_no_error_at_any_site():
    """A skew acts along x alone, so y has no mode at all."""
    skew = {"skew": {"random": "1 urad", "shape": "skew"}}
    masks = [mask("A"), mask("B", "A", terms=skew)]
    result = analyse(flow_of(bare_flow(masks, [overlay_pair("A", "B", limit=9)], **GEOMETRY)))
    assert entry(result, "A-B", "x").overlay.random == pytest.approx(5)
    along_y = entry(result, "A-B", "y")
    assert (along_y.overlay.random, along_y.margin.linear, along_y.sources, along_y.point) == (0, 9, (), None)

"""The alignment graph: references, readers, common reference and chain, each axis on its own."""

import pytest

from flowplan.engine.graph import AlignmentGraph, Chain
from tests.support.flows import bare_flow, flow_of, mask


def graph(masks, **more):
    return AlignmentGraph(flow_of(bare_flow(masks, [], **more)))


@pytest.fixture
def tree():
    """wafer - A - B - D, A - C; C also starts E along x, B along y."""
    masks = [mask("A"), mask("B", "A"), mask("C", "A"), mask("D", "B"), mask("E", {"x": "C", "y": "B"})]
    return graph(masks, self_aligned=[{"id": "S", "follows": {"x": "D", "y": "C"}}])


def weighted(**weights):
    return [{"mask": name, "weight": weight} for name, weight in weights.items()]


class TestNeighbours:
    def test_references_of_a_mask(self, tree):
        assert tree.references("A", axis="x") == (("wafer", 1.0),)
        assert tree.references("E", axis="x") == (("C", 1.0),)
        assert tree.references("E", axis="y") == (("B", 1.0),)

    def test_a_feature_refers_to_what_it_follows(self, tree):
        assert tree.references("S", axis="x") == (("D", 1.0),)
        assert tree.references("S", axis="y") == (("C", 1.0),)

    def test_the_wafer_refers_to_nothing(self, tree):
        assert tree.references("wafer", axis="x") == ()

    def test_readers_in_process_order(self, tree):
        assert tree.readers("wafer", axis="x") == ("A",)
        assert tree.readers("A", axis="x") == ("B", "C")
        assert tree.readers("B", axis="y") == ("D", "E")
        assert tree.readers("C", axis="y") == ("S",)
        assert tree.readers("E", axis="x") == ()

    def test_averages_keep_their_weights_in_the_files_order(self):
        one = graph([mask("A"), mask("B", "A"), mask("C", weighted(B=0.7, A=0.3))])
        assert one.references("C", axis="x") == (("B", 0.7), ("A", 0.3))
        assert one.is_averaged("C", axis="y")
        assert not one.is_averaged("B", axis="y")

    def test_weights_left_out_are_equal(self):
        one = graph([mask("A"), mask("B", "A"), mask("C", ["A", "B"])])
        assert one.references("C", axis="x") == (("A", 0.5), ("B", 0.5))

    def test_an_average_on_one_axis_alone(self):
        one = graph([mask("A"), mask("B", "A"), mask("C", {"x": ["A", "B"], "y": "A"})])
        assert (one.is_averaged("C", axis="x"), one.is_averaged("C", axis="y")) == (True, False)


class TestCommonReference:
    @pytest.mark.parametrize(
        ("first", "second", "axis", "expected"),
        [
            ("D", "C", "x", "A"),
            ("C", "D", "x", "A"),
            ("D", "B", "x", "B"),  # one derives from the other
            ("D", "D", "x", "D"),
            ("E", "D", "x", "A"),
            ("E", "D", "y", "B"),
            ("S", "D", "x", "D"),
            ("S", "E", "y", "A"),
            ("A", "wafer", "x", "wafer"),
        ],
    )
    def test_is_the_latest_that_both_derive_from(self, tree, first, second, axis, expected):
        assert tree.common_reference(first=first, second=second, axis=axis) == expected

    def test_is_the_wafer_for_two_roots(self):
        assert graph([mask("A"), mask("B")]).common_reference(first="A", second="B", axis="x") == "wafer"

    def test_with_averages_the_latest_shared_by_any_way_counts(self):
        masks = [mask("A"), mask("B", "A"), mask("C", ["A", "B"]), mask("D", "B")]
        assert graph(masks).common_reference(first="C", second="D", axis="x") == "B"


class TestChain:
    def test_up_to_the_common_reference_and_down(self, tree):
        found = tree.chain(first="D", second="C", axis="x")
        assert found == Chain(("D", "B", "A", "C"), "A", one_of_several=False)

    def test_each_axis_has_its_own(self, tree):
        assert tree.chain(first="D", second="E", axis="x").layers == ("D", "B", "A", "C", "E")
        assert tree.chain(first="D", second="E", axis="y").layers == ("D", "B", "E")

    def test_turns_round_with_the_pair(self, tree):
        there = tree.chain(first="D", second="E", axis="x")
        back = tree.chain(first="E", second="D", axis="x")
        assert back.layers == there.layers[::-1]

    def test_straight_up_and_straight_down(self, tree):
        assert tree.chain(first="D", second="A", axis="x").layers == ("D", "B", "A")
        assert tree.chain(first="A", second="D", axis="x").layers == ("A", "B", "D")
        assert tree.chain(first="D", second="wafer", axis="x").layers == ("D", "B", "A", "wafer")

    def test_of_a_layer_with_itself(self, tree):
        assert tree.chain(first="D", second="D", axis="x") == Chain(("D",), "D", one_of_several=False)

    def test_hops_name_the_reader_first(self, tree):
        found = tree.chain(first="D", second="E", axis="x")
        assert found.hops() == (("D", "B"), ("B", "A"), ("C", "A"), ("E", "C"))
        assert tree.chain(first="D", second="D", axis="x").hops() == ()


class TestChainOfAverages:
    def test_follows_the_heaviest_way(self):
        masks = [mask("A"), mask("B", "A"), mask("C", "A"), mask("D", weighted(B=0.4, C=0.6))]
        found = graph(masks).chain(first="A", second="D", axis="x")
        assert found == Chain(("A", "C", "D"), "A", one_of_several=True)

    def test_the_first_named_wins_a_tie(self):
        masks = [mask("A"), mask("B", "A"), mask("C", "A"), mask("D", ["C", "B"])]
        assert graph(masks).chain(first="D", second="A", axis="x").layers == ("D", "C", "A")

    def test_weights_multiply_along_the_way(self):
        """By way of C: 0.6 x 0.5 = 0.3 each; by way of B: 0.4 x 1."""
        masks = [
            mask("A"), mask("P", "A"), mask("Q", "A"), mask("B", "A"),
            mask("C", ["P", "Q"]), mask("D", weighted(C=0.6, B=0.4)),
        ]  # fmt: skip
        assert graph(masks).chain(first="D", second="A", axis="x").layers == ("D", "B", "A")

    def test_a_way_that_misses_the_common_reference_is_left_out(self):
        """D reads C with more weight, but only B leads to what D shares with E."""
        masks = [
            mask("A"), mask("B", "A"), mask("C", "A"),
            mask("D", weighted(C=0.9, B=0.1)), mask("E", "B"),
        ]  # fmt: skip
        found = graph(masks).chain(first="D", second="E", axis="x")
        assert found == Chain(("D", "B", "E"), "B", one_of_several=True)

    def test_masks_outside_the_way_do_not_disturb(self):
        """X stands between in process order, inherits from A, and D knows nothing of it."""
        masks = [mask("A"), mask("X", "A"), mask("B", "A"), mask("C", "A"), mask("D", ["B", "C"])]
        assert graph(masks).chain(first="D", second="A", axis="x").layers == ("D", "B", "A")

    def test_starts_straight_and_splits_later(self):
        masks = [mask("A"), mask("B", "A"), mask("C", "A"), mask("D", weighted(B=0.2, C=0.8)), mask("E", "D")]
        found = graph(masks).chain(first="E", second="A", axis="x")
        assert found == Chain(("E", "D", "C", "A"), "A", one_of_several=True)

    def test_an_average_above_the_common_reference_leaves_one_way(self):
        masks = [mask("A"), mask("B", "A"), mask("C", ["A", "B"]), mask("D", "C"), mask("E", "C")]
        found = graph(masks).chain(first="D", second="E", axis="x")
        assert found == Chain(("D", "C", "E"), "C", one_of_several=False)

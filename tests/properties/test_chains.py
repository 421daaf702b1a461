"""Chains against networkx on a graph built here, and chain RSS against an explicit sum over the hops."""

import math
from itertools import pairwise

import networkx as nx
import pytest
from hypothesis import given

from tests.support.byhand import ByHand, Form, deviation, place_of, rows, scale_of, sites
from tests.support.flows import margins_of
from tests.support.random_flows import flows

SINGLE = flows(averages=False, most_masks=8)


def readings(data, axis):
    """From every layer to what it reads or follows, with weights; in the order of the file."""
    hand = ByHand(data, (), None)
    graph = nx.DiGraph()
    graph.add_node("wafer")
    for mask in data["masks"]:
        for reference, weight, _ in hand.readings(mask["id"], axis):
            graph.add_edge(mask["id"], reference, weight=weight)
    for feature in data["self_aligned"]:
        graph.add_edge(feature["id"], hand.parent(feature["id"], axis), weight=1.0)
    return graph


def weight_of(graph, way):
    return math.prod(graph.edges[hop]["weight"] for hop in pairwise(way))


@given(data=SINGLE)
def test_single_references_make_a_tree(data):
    for entry in margins_of(data).entries:
        graph = readings(data, entry.axis)
        first, second = entry.layers
        assert entry.chain.through == nx.lowest_common_ancestor(graph.reverse(), first, second)
        assert list(entry.chain.layers) == nx.shortest_path(graph.to_undirected(), first, second)
        assert not entry.chain.one_of_several


@given(data=flows(most_masks=7))
def test_averages_take_the_heaviest_way_to_the_latest_common_reference(data):
    result = margins_of(data)
    order = ["wafer", *result.flow.layers]
    for entry in result.entries:
        graph = readings(data, entry.axis)
        first, second = entry.layers
        common = (nx.descendants(graph, first) | {first}) & (nx.descendants(graph, second) | {second})
        through = max(common, key=order.index)
        turn = entry.chain.layers.index(through)
        up, down = entry.chain.layers[: turn + 1], entry.chain.layers[turn:][::-1]
        assert entry.chain.through == through
        several = []
        for layer, way in ((first, up), (second, down)):
            ways = [[layer]] if layer == through else list(nx.all_simple_paths(graph, layer, through))
            assert list(way) in ways
            assert weight_of(graph, way) == pytest.approx(max(weight_of(graph, w) for w in ways), rel=1e-12)
            several += [graph.out_degree(name) > 1 for name in way[:-1]]
        assert entry.chain.one_of_several == any(several)


@given(data=SINGLE)
def test_every_hop_is_a_reading_or_a_following(data):
    for entry in margins_of(data).entries:
        graph = readings(data, entry.axis)
        hops = entry.chain.hops()
        assert len(hops) == len(entry.chain.layers) - 1
        assert all(graph.has_edge(child, reference) for child, reference in hops)


@given(data=SINGLE)
def test_chain_rss_adds_the_variance_of_every_hop_s_own_overlay(data):
    """Where the pair is the same everywhere, its hops may not be: the first site counts for them."""
    for entry, (_, _, _, axis) in zip(margins_of(data).entries, rows(data), strict=True):
        at = place_of(entry) if entry.point else tuple(sites(data)[0])
        graph = readings(data, axis)
        variance = 0.0
        for one, other in pairwise(nx.shortest_path(graph.to_undirected(), *entry.layers)):
            child, reference = (one, other) if graph.has_edge(one, other) else (other, one)
            hand = ByHand(data, ("random", "uniform"), lambda key: Form({key: 1.0}), at)
            above = 0.0 if reference == "wafer" else hand.device(reference, axis)
            hop = Form() + hand.device(child, axis) + (-1.0) * above
            variance += hop.square(lambda key: deviation(data, key))
        expected = data["confidence"] * math.sqrt(variance)
        assert entry.chain_rss == pytest.approx(expected, rel=1e-9, abs=1e-13 * scale_of(data, entry))


@given(data=flows())
def test_chain_rss_is_left_out_exactly_where_references_are_averaged(data):
    for entry in margins_of(data).entries:
        assert (entry.chain_rss is None) == entry.chain.one_of_several

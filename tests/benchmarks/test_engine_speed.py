"""The engine on a flow of 200 masks and 2,000 pairs with every shape on a 300 mm wafer.

Results are ratios of times taken in turns in one run, the quickest of several on either side, so
that neither the machine nor what else runs on it matters much.
"""

import random
from itertools import count

import pytest
from uncertainties import ufloat

from flowplan.engine.analysis import Engine, analyse
from tests.support.byhand import KINDS, ByHand, deviation, rows, sites
from tests.support.flows import flow_of
from tests.support.generated import generated_flow
from tests.support.timing import quickest_in_turns


class AtOneSite:
    """All layers at one site in the numbers of `uncertainties`, ready for pair after pair.

    Every error is a variable tagged with its kind; an offset is a variable as well, of which the
    coefficient is wanted. With `expanded` every layer is resolved into its variables beforehand, so
    that a pair costs one difference and one look at its components, which is as good as it gets
    without arrays; else the package resolves each pair by itself, as it does when nobody cares.
    """

    def __init__(self, data, expanded, point=(26.0, 33.0, 13.0, 16.5)):
        self.data = data
        numbers = count()

        def scalar(key):
            kind = key[-1]
            std = deviation(data, key) if kind in ("random", "uniform") else 1.0
            return ufloat(0, std, tag=(kind, next(numbers)))

        self.hand = ByHand(data, KINDS, scalar, point)
        for layer in [m["id"] for m in data["masks"]] + [f["id"] for f in data["self_aligned"]]:
            for axis in "xy":
                for number in (self.hand.printed(layer, axis), self.hand.device(layer, axis)):
                    assert not expanded or number.derivatives

    def margin(self, row):
        """Return offset, bound and variance of one pair on one axis."""
        pair, first, second, axis = row
        number = self.hand.overlay(first, second, axis) + self.hand.edges(pair["rule"], first, second, axis)
        found = dict.fromkeys(KINDS, 0.0)
        for variable, coefficient in number.derivatives.items():
            kind = variable.tag[0]
            size = coefficient * variable.std_dev
            found[kind] += (
                size * size if kind in ("random", "uniform") else abs(size) if kind == "bound" else size
            )
        return found["offset"], found["bound"], found["random"] + found["uniform"]


@pytest.fixture(scope="module")
def data():
    return generated_flow(masks=200, pairs=2000)


def test_the_flow_is_as_large_as_it_says(data):
    flow = flow_of(data)
    assert len(flow.masks) == 200
    assert len(flow.pairs) == 2000
    assert flow.shapes == {"rotation", "magnification", "scale", "skew"}
    assert Engine.of(flow).sites.n_points == len(sites(data)) >= 500


def test_a_thousand_times_faster_than_pair_by_pair_with_uncertainties(data, benchmark):
    """Both find offset, bound and variance of every pair on every axis at every site.

    The slow way is measured at one site: placing all layers there, and a sample of pairs, scaled to
    all pairs and all sites. The engine is measured whole, from the flow to the last entry. Against
    layers that were expanded beforehand the factor is some thousand on an idle machine; there only
    a third of it is asked, so that a busy one passes as well.
    """
    flow, everything = flow_of(data), rows(data)
    sample, few = (random.Random(3).sample(everything, n) for n in (60, 8))
    plain, expanded = AtOneSite(data, expanded=False), AtOneSite(data, expanded=True)
    works = (
        lambda: analyse(flow),
        lambda: AtOneSite(data, expanded=False),
        lambda: [plain.margin(row) for row in few],
        lambda: AtOneSite(data, expanded=True),
        lambda: [expanded.margin(row) for row in sample],
    )
    engine, place, one_by_one, place_expanded, from_expanded = benchmark.pedantic(
        quickest_in_turns, args=(2, *works)
    )

    def times_faster(placing, pairs, number):
        return len(sites(data)) * (placing + pairs * len(everything) / number) / engine

    by_pair = times_faster(place, one_by_one, len(few))
    by_expanded = times_faster(place_expanded, from_expanded, len(sample))
    benchmark.extra_info |= {"times faster": round(by_pair), "than from expanded layers": round(by_expanded)}
    assert by_pair > 1000
    assert by_expanded > 333


def test_the_slow_way_gives_the_same_answer(data):
    """Or the comparison would mean nothing: at the points of two entries."""
    entries = analyse(flow_of(data)).entries
    everything = rows(data)
    for i in random.Random(4).sample(range(len(everything)), 2):
        p = entries[i].point
        _, bound, variance = AtOneSite(data, True, (p.X, p.Y, p.x, p.y)).margin(everything[i])
        assert entries[i].residual.bound == pytest.approx(bound, rel=1e-9)
        assert entries[i].residual.random == pytest.approx(3 * variance**0.5, rel=1e-9)


def test_cost_is_linear_in_the_number_of_pairs(data, benchmark):
    """Four times the pairs take less than five times the time; placing the layers counts in both."""
    few, many = (flow_of({**data, "pairs": data["pairs"][:n]}) for n in (500, 2000))
    works = (lambda: analyse(few), lambda: analyse(many))
    quarter, whole = benchmark.pedantic(quickest_in_turns, args=(2, *works))
    benchmark.extra_info["500 to 2,000 pairs"] = round(whole / quarter, 2)
    assert whole / quarter < 5


def test_ten_times_the_sites_take_less_than_ten_times_the_time(data, benchmark):
    pairs = data["pairs"][:500]
    small, large = (
        flow_of({**data, "pairs": pairs, "wafer": {"diameter": size}}) for size in ("100 mm", "300 mm")
    )
    few, many = (Engine.of(flow).sites.n_points for flow in (small, large))
    assert many / few > 10
    one, other = benchmark.pedantic(
        quickest_in_turns, args=(2, lambda: analyse(small), lambda: analyse(large))
    )
    benchmark.extra_info[f"{few} to {many} sites"] = round(other / one, 2)
    assert other / one < many / few

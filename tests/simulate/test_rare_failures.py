"""Importance-sampled fail fractions against exact tails of scipy.stats and its quadrature."""

import math

import pytest
from scipy import integrate, stats

from flowplan.engine.simulate.rare import ROW_SAMPLES, UNION_SAMPLES
from tests.simulate.flows import Z_SURE, one_pair, simulated
from tests.support.flows import bare_flow, mask, overlay_pair

#: What the estimates may use.
MOST_SAMPLES = 100_000
LARGEST_ERROR = 0.10


def check(rare, exact):
    assert max(ROW_SAMPLES, UNION_SAMPLES) <= MOST_SAMPLES
    assert 0 < rare.relative_error <= LARGEST_ERROR
    assert rare.fail <= 1
    assert rare.fail == pytest.approx(exact, rel=Z_SURE * rare.relative_error)


@pytest.mark.parametrize("exact", [0.9, 0.3, 1e-2, 1e-4, 1e-6, 1e-9, 1e-12, 1e-30])
def test_normal_tail_on_both_sides(exact):
    limit = stats.norm.isf(exact / 2)
    found = simulated(one_pair({"a": 0.8, "b": 0.6}, limit), 100)
    check(found.pairs[0].rare, exact)
    check(found.rare, exact)


@pytest.mark.parametrize("sigmas", [1.0, 3.0, 4.5, 6.0])
def test_normal_tail_on_one_side(sigmas):
    found = simulated(one_pair({"a": {"random": 5.0, "offset": 40.0}}, 40.0 + 5 * sigmas), 100)
    check(found.pairs[0].rare, stats.norm.sf(sigmas) + stats.norm.sf(sigmas + 16))


@pytest.mark.parametrize("sigmas", [2.0, 4.0, 6.0])
def test_a_bound_takes_room_at_its_worst_sign_on_both_sides(sigmas):
    found = simulated(one_pair({"a": {"random": 5.0, "bound": 12.0}}, 12.0 + 5 * sigmas), 100)
    check(found.pairs[0].rare, 2 * stats.norm.sf(sigmas))


@pytest.mark.parametrize("limit", [3.0, 5.0, 8.0, 9.5, 11.0])
def test_normal_and_uniform(limit):
    """One sigma of 1 and a uniform of ±6: the limits lie inside, at the end of, and beyond the uniform."""
    found = simulated(one_pair({"a": 1.0, "b": {"uniform": 6.0}}, limit), 100)
    tail, _ = integrate.quad(lambda u: stats.norm.sf(limit - u), -6, 6, epsabs=0, epsrel=1e-10)
    check(found.pairs[0].rare, 2 * tail / 12)


def test_three_uniforms_near_the_corner():
    """Three of ±1: beyond 3 - d lies the corner's volume d^3 / 48 (Irwin-Hall)."""
    terms = {f"u{i}": {"uniform": 1.0} for i in range(3)}
    found = simulated(one_pair(terms, 3 - 1e-2), 100)
    check(found.pairs[0].rare, 2 * 1e-2**3 / 48)


def test_a_bound_drawn_uniformly():
    found = simulated(one_pair({"a": {"random": 1.0, "bound": 3.0}}, 7.0), 100, bounds="uniform")
    tail, _ = integrate.quad(lambda u: stats.norm.sf(7 - u), -3, 3, epsabs=0, epsrel=1e-10)
    check(found.pairs[0].rare, 2 * tail / 6)


def test_what_cannot_happen_has_no_error():
    found = simulated(one_pair({"a": {"uniform": 3.0}, "b": {"uniform": 2.0}}, 5.5), 100)
    assert (found.pairs[0].rare.fail, found.pairs[0].rare.relative_error) == (0.0, None)
    assert (found.rare.fail, found.rare.relative_error) == (0.0, None)


def test_what_always_happens():
    found = simulated(one_pair({"a": {"offset": 6.0}}, 5.0), 100)
    assert (found.pairs[0].rare.fail, found.rare.fail, found.joint_yield) == (1.0, 1.0, 0.0)


def test_what_nearly_always_happens_is_not_called_certain():
    """Edges of one sigma that lack 4.5 sigma of room: all draws fail, yet the fraction is not 1."""
    masks = [mask("A"), mask("B", "A", cd=2.0)]
    pair = {
        "name": "p",
        "rule": "enclosure",
        "inner": "A",
        "outer": "B",
        "drawn": 1.0,
        "keep": 5.5,
        "axes": "x",
    }
    found = simulated(bare_flow(masks, [pair]), 100)
    check(found.pairs[0].rare, stats.norm.cdf(4.5))
    check(found.rare, stats.norm.cdf(4.5))


@pytest.mark.parametrize("drawn", [2.0, 6.0, 12.0])
def test_edges_that_close_both_sides_at_once_count_once(drawn):
    """CD dominates, so both sides fail together; the closed form adds them, the simulation does not."""
    masks = [mask("A"), mask("B", "A", terms={"a": 0.4}, cd=4.0)]
    pair = {"name": "p", "rule": "enclosure", "inner": "A", "outer": "B", "drawn": drawn, "axes": "x"}
    found = simulated(bare_flow(masks, [pair]), 100)
    cov = [[4.16, 3.84], [3.84, 4.16]]  # E ± e with variances 4 and 0.16
    neither = stats.multivariate_normal(cov=cov).cdf([drawn, drawn])
    one = stats.norm.sf(drawn / math.sqrt(4.16))
    both = stats.multivariate_normal(cov=cov).cdf([-drawn, -drawn])
    check(found.pairs[0].rare, 1 - neither if drawn < 8 else 2 * one - both)


def test_an_estimate_is_never_above_one():
    """Four pairs without room, so that both sides of each always fail: the weights scatter about 1."""
    masks = [mask("A"), *(mask(f"B{i}", "A", terms={"t": {"random": 1.0, "bound": 2.0}}) for i in range(4))]
    pairs = [overlay_pair("A", f"B{i}", limit=0.2, axes="x") for i in range(4)]
    check(simulated(bare_flow(masks, pairs), 100).rare, 1.0)


def star(n, limit, **tool):
    """Masks that each read the first one, so that their errors against it are independent."""
    masks = [mask("A"), *(mask(f"B{i}", "A", terms={"t": 1.0}) for i in range(n))]
    return bare_flow(masks, [overlay_pair("A", f"B{i}", limit=limit, axes="x") for i in range(n)])


def test_union_of_independent_pairs():
    """Six of 1e-9 each: 1 - (1 - p)^6."""
    found = simulated(star(6, stats.norm.isf(0.5e-9)), 100)
    check(found.rare, -math.expm1(6 * math.log1p(-1e-9)))


def test_union_of_pairs_that_fail_together():
    """The same pair under two names fails once."""
    data = star(1, stats.norm.isf(0.5e-9))
    data["pairs"].append({**data["pairs"][0], "name": "again"})
    check(simulated(data, 100).rare, 1e-9)


def test_union_of_correlated_pairs():
    """Two overlays with a correlation of 0.7071 in the tail at four sigma, by a bivariate normal."""
    masks = [mask("A"), mask("B", "A", terms={"t": 1.0}), mask("C", "B", terms={"t": 1.0})]
    limits = 4.0, 4 * math.sqrt(2)
    pairs = [overlay_pair("A", b, limit=v, axes="x") for b, v in zip("BC", limits, strict=True)]
    found = simulated(bare_flow(masks, pairs), 100)
    normal = stats.multivariate_normal(cov=[[1, 1], [1, 2]])
    same = 2 * normal.cdf([-v for v in limits])
    check(found.rare, 2 * 2 * stats.norm.sf(4) - same)

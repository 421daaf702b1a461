"""Landing pairs of whole flows: by hand, and against drawing every source."""

import math

import numpy as np
import pytest
from scipy import stats

from tests.landing.material import GEOMETRY, contact_on_pad, drawn_areas, landed, landing

SAMPLES = 400_000


def test_a_half_landed_contact_has_twice_the_resistance():
    # common practice, no source: resistance goes with one over the landed area
    shifted = {"place": {"offset": {"x": 500, "y": 0}}}
    found = landed(contact_on_pad(landing(resistance={"nominal": 8, "limit": 12}), terms=shifted))
    assert (found.nominal_area, found.mean_area) == pytest.approx((0.5, 0.5))
    assert (found.resistance.median, found.resistance.q99) == pytest.approx((16, 16))
    assert (found.resistance.nominal, found.resistance.above_limit) == (8, 1)
    assert found.verdict == "fail"


def test_a_complete_miss_is_an_open():
    # common practice, no source
    shifted = {"place": {"offset": {"x": 0, "y": -800}}}
    found = landed(contact_on_pad(landing(least_area=0.5, resistance={"nominal": 8}), terms=shifted))
    assert (found.nominal_area, found.mean_area, found.open, found.below_least) == (0, 0, 1, 1)
    assert found.area_quantiles == (0, 0, 0)
    assert found.resistance.median == math.inf
    assert found.resistance.above_limit is None


def test_a_contact_wholly_inside_its_pad_lands_wholly():
    found = landed(contact_on_pad(landing(least_area=1), read={"bound": 200}))
    assert found.nominal_area == 1
    assert found.area_quantiles == pytest.approx((1, 1, 1))
    assert (found.below_least, found.open, found.verdict) == (0, 0, "pass")


def test_a_pad_smaller_than_the_contact_caps_the_area():
    found = landed(contact_on_pad(landing(contact=600, pad=(300, 900))))
    assert (found.nominal_area, found.mean_area, found.verdict) == pytest.approx((0.5, 0.5, "unjudged"))


def test_a_contact_grown_by_its_cd_lands_with_more_than_it_was_drawn():
    # full widths 600 + 60 each: (660 / 600)^2 of the drawn area, and less resistance
    found = landed(contact_on_pad(landing(resistance={"nominal": 8}), cds=({"offset": 60}, None)))
    assert found.nominal_area == pytest.approx(1.21)
    assert found.resistance.median == pytest.approx(8 / 1.21)


def test_offsets_belong_to_the_nominal_area_and_bounds_do_not():
    terms = {"place": {"offset": {"x": 300, "y": 0}}, "bow": {"bound": {"x": 60, "y": 0}}}
    found = landed(contact_on_pad(landing(), terms=terms))
    # 500 - 300 from the pad's edge: 100 of 600 are off; the bound takes 60 more
    assert found.nominal_area == pytest.approx(500 / 600)
    assert found.mean_area == pytest.approx(440 / 600)


def test_bounds_of_both_widths_shrink_them():
    found = landed(contact_on_pad(landing(600, 580), cds=({"bound": 20}, {"bound": 40})))
    # each edge 10 and 20 in: the pad is 540 wide, the contact 580
    assert found.nominal_area == pytest.approx((580 / 600) ** 2)
    assert found.mean_area == pytest.approx((540 / 600) ** 2)


def test_resistance_from_a_specific_contact_resistivity():
    # common practice, no source: R = rho / A; 20 ohm um2 over 2 um by 0.5 um are 20 ohm
    pair = landing(("2 um", 500), 5000, resistance={"resistivity": "20 ohm um2"})
    assert landed(contact_on_pad(pair)).resistance.nominal == pytest.approx(20)
    micrometres = landing((2, 0.5), 5, resistance={"resistivity": "2e-7 ohm cm2"})
    assert landed(contact_on_pad(micrometres, unit="um")).resistance.nominal == pytest.approx(20)


def test_the_verdict_counts_what_misses_area_or_resistance():
    # one axis varies, no CD: 70 % land where |e| <= 800 - 420; R <= 10 asks for 80 %, |e| <= 320
    pair = landing((600, 600), (1000, 3000), least_area=0.7, resistance={"nominal": 8, "limit": 10})
    found = landed(contact_on_pad(pair, read={"random": {"x": 110, "y": 0}}))
    p_area, p_ohm = (2 * stats.norm.sf(room / 110) for room in (380, 320))
    assert (found.below_least, found.resistance.above_limit) == pytest.approx((p_area, p_ohm), rel=1e-4)
    assert found.fail_probability == found.resistance.above_limit
    assert found.verdict == "fail"  # 3600 ppm of 2700


@pytest.mark.parametrize(
    ("allowed", "reserve", "verdict"),
    [(3700, 0, "pass"), (3500, 0, "fail"), (3700, 0.1, "tight"), (4100, 0.1, "pass")],
)
def test_tight_means_within_the_reserve_of_what_is_allowed(allowed, reserve, verdict):
    # 3620 ppm fail, see above
    pair = landing((600, 600), (1000, 3000), least_area=0.8, allowed_ppm=allowed)
    flow = contact_on_pad(pair, read={"random": {"x": 110, "y": 0}}, reserve=reserve)
    assert landed(flow).verdict == verdict


def close_to_sampling(data, seed):
    """Every figure of a landing against drawn sources, within five standard errors."""
    found = landed(data)
    areas = drawn_areas(data, found, SAMPLES, seed)
    error = areas.std() / SAMPLES**0.5
    assert found.mean_area == pytest.approx(areas.mean(), abs=5 * error)
    for probability, sampled in (
        (found.below_least, (areas < found.pair.least_area).mean()),
        (found.open, (areas == 0).mean()),
        (found.resistance.above_limit, (areas < 8 / 12).mean()),
    ):
        assert sampled == pytest.approx(probability, abs=5 * (probability / SAMPLES) ** 0.5 + 1e-6)
    for p, quantile in zip((0.00135, 0.01, 0.5), found.area_quantiles, strict=True):
        assert (areas < quantile).mean() == pytest.approx(p, abs=5 * (p / SAMPLES) ** 0.5)
    return found


JUDGED = {"least_area": 0.8, "resistance": {"nominal": 8, "limit": 12}}


def test_displacements_and_cds_on_both_axes_against_sampling():
    pair = landing((600, 500), (700, 620), **JUDGED)
    flow = contact_on_pad(pair, read={"x": 60, "y": 80}, cds=({"random": 40, "offset": -20}, 50))
    close_to_sampling(flow, 11)


def test_a_rotation_that_moves_both_axes_against_sampling():
    # at the field's corner 20 urad turn e by (-120, 160) nm: almost wholly correlated with 60 read
    pair = landing(600, 700, **JUDGED)
    turn = {"turn": {"random": "20 urad", "shape": "rotation"}}
    flow = contact_on_pad(pair, read=60, cds=(30, 30), terms=turn) | GEOMETRY
    found = close_to_sampling(flow, 12)
    assert found.point is not None
    assert (abs(found.point.x), abs(found.point.y)) == (8, 6)


def test_leaving_the_correlation_out_would_be_seen():
    pair = landing(600, 700, **JUDGED)
    turn = {"turn": {"random": "20 urad", "shape": "rotation"}}
    apart = {"turn": {"random": {"x": 120, "y": 160}}}
    coupled = landed(contact_on_pad(pair, read=20, terms=turn) | GEOMETRY)
    independent = landed(contact_on_pad(pair, read=20, terms=apart))
    # given that x is far off, y is too: the mean of the product grows, and so do complete misses
    assert coupled.mean_area > independent.mean_area + 0.01


def test_edges_that_a_self_aligned_pad_takes_over_against_sampling():
    pair = landing(600, 640, **JUDGED) | {"pad": {"layer": "PAD", "x": 640, "y": 640}}
    flow = contact_on_pad(pair, read=60, cds=(None, 60))
    # the contact is a spacer that follows the pad in place and in edges, with edges of its own
    flow["masks"] = [m for m in flow["masks"] if m["id"] == "PAD"]
    follows = {"id": "CONTACT", "follows": "PAD", "tone": "opposite", "edge": {"random": 15}}
    flow["self_aligned"] = [follows]
    close_to_sampling(flow, 13)


def test_the_worst_site_is_the_one_at_which_most_fail():
    pair = landing(600, 700, least_area=0.8)
    shape = {
        "grow": {"offset": "4 ppm", "shape": "magnification"},
        "turn": {"random": "9 urad", "shape": "rotation", "over": "wafer"},
    }
    flow = contact_on_pad(pair, read=50, terms=shape) | GEOMETRY
    found = landed(flow)
    at_sites = every_site(flow)
    assert found.fail_probability == pytest.approx(max(at_sites), rel=1e-6)
    assert min(at_sites) < 0.3 * max(at_sites)


def every_site(data):
    """Failures at each site, none left out."""
    from flowplan.engine.analysis import Engine
    from flowplan.engine.landing.judge import LandingView, _Case
    from tests.support.flows import flow_of

    flow = flow_of(data)
    engine = Engine.of(flow)
    view = LandingView(flow, engine.placement, engine._kernels, engine.sites, engine.graph)
    case = _Case(view, flow.pairs[0], "PAD", "CONTACT")
    corners = np.flatnonzero((engine.sites.positions[:, 2:] != 0).all(axis=1))
    return [case._area(int(site), (1, 1)).less(0.8) for site in [0, 4, *corners[::3]]]


def test_one_entry_for_each_layer_of_a_split_pad():
    flow = contact_on_pad(landing(), read=20)
    flow["masks"].insert(1, flow["masks"][0] | {"id": "PAD2", "aligns_to": "PAD"})
    flow["pairs"] = [landing() | {"pad": {"layer": "M", "x": 1000, "y": 1000}}]
    from flowplan.engine.analysis import analyse
    from tests.support.flows import flow_of

    found = analyse(flow_of(flow | {"split_layers": {"M": ["PAD", "PAD2"]}}))
    assert [entry.layers for entry in found.landings] == [("PAD", "CONTACT"), ("PAD2", "CONTACT")]
    assert found.counts["unjudged"] == 2

"""Chains and error budgets by exact arithmetic, worked by hand for these checks.

That averaging over several exposures must not be read as a smaller overlay error is the subject of
Gabor and Felix, J. Micro/Nanolith. MEMS MOEMS 18(2), 021202 (2019), of which only the abstract was
seen; the figures on averages here are our own derivation.
"""

import math

import pytest
from scipy.stats import norm

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure

THREE_SIGMA = {"sigma": 3, "confidence": 3}


def chain_of(*steps):
    """One mask a step, each reading the one before with the step's error."""
    names = ["M0", *(f"M{i}" for i in range(1, len(steps) + 1))]
    masks = [mask("M0")]
    for below, name, step in zip(names, names[1:], steps, strict=False):
        masks.append(mask(name, [{"mask": below, "alignment": step}]))
    data = bare_flow(masks, [overlay_pair("M0", names[-1])], **THREE_SIGMA)
    return entry(margins_of(data), f"M0-{names[-1]}").overlay.random


@pytest.mark.parametrize(
    ("steps", "printed"),
    [
        ((30,), "30"),
        ((30, 30), "42.42641"),
        ((30, 30, 30), "51.96152"),
        ((30, 30, 30, 30), "60"),
        ((30, 40), "50"),
        ((20, 30, 40), "53.85165"),
    ],
)
def test_independent_steps(steps, printed):
    assert Figure(printed, math.hypot(*steps), "root-sum-square").agrees_with(chain_of(*steps))


def test_siblings():
    masks = [mask("A"), mask("B", "A"), mask("C", "A")]
    data = bare_flow(masks, [overlay_pair("B", "C")], tools={"tool": {"alignment": 30}}, **THREE_SIGMA)
    value = entry(margins_of(data), "B-C").overlay.random
    assert Figure("42.42641", 30 * math.sqrt(2), "two readings of one mark").agrees_with(value)


def test_random_and_systematic_parts():
    terms = {f"r{size}": size for size in (20, 15, 12)} | {f"b{size}": {"bound": size} for size in (5, 3)}
    masks = [mask("A"), mask("B", "A", terms=terms)]
    found = entry(margins_of(bare_flow(masks, [overlay_pair("A", "B")], **THREE_SIGMA)), "A-B")
    assert Figure("27.73085", math.sqrt(769), "random parts").agrees_with(found.overlay.random)
    assert Figure("35.73085", 8 + math.sqrt(769), "bounds added").agrees_with(found.need.mixed)
    assert Figure("55", 55.0, "everything added").agrees_with(found.need.linear)


def test_bounds_are_added_before_they_join_a_root_sum_square():
    """All five as random give 28.33725; on basis rss flowplan adds the two bounds to 8 first."""
    terms = {f"r{size}": size for size in (20, 15, 12, 5, 3)}
    masks = [mask("A"), mask("B", "A", terms=terms)]
    found = entry(margins_of(bare_flow(masks, [overlay_pair("A", "B")], **THREE_SIGMA)), "A-B")
    assert Figure("28.33725", math.sqrt(803), "all as random").agrees_with(found.need.rss)


@pytest.mark.parametrize(("share", "printed"), [(0.8, "0.632456"), (1, "0"), (0, "1.414214")])
def test_two_masks_on_one_tool(share, printed):
    lens = {"lens": {"random": 1, "enters": "pattern", "common": share}}
    masks = [mask("A"), mask("B", "A")]
    data = bare_flow(masks, [overlay_pair("A", "B")], tools={"tool": {"terms": lens}})
    value = entry(margins_of(data), "A-B").overlay.random
    assert Figure(printed, math.sqrt(2 * (1 - share)), "sigma sqrt(2 (1 - c))").agrees_with(value)


def test_a_mask_on_the_mean_of_two():
    """A1 and A2 lie sigma off the grid each; C reads both with sigma in all, MEAN without error."""
    both = ["A1", "A2"]
    masks = [
        mask("GRID"),
        mask("A1", [{"mask": "GRID", "alignment": 1}]),
        mask("A2", [{"mask": "GRID", "alignment": 1}]),
        mask("MEAN", both),
        mask("C", both, terms={"alignment of both": 1}),
    ]
    result = margins_of(bare_flow(masks, [overlay_pair("MEAN", "C"), overlay_pair("A1", "C")]))
    to_mean, to_one = entry(result, "MEAN-C"), entry(result, "A1-C")
    assert Figure("1", 1.0, "only its own error").agrees_with(to_mean.overlay.random)
    assert Figure("1.224745", math.sqrt(1.5), "half of each of the two").agrees_with(to_one.overlay.random)
    assert to_one.chain_rss is None


def test_a_width_moves_each_edge_by_half():
    masks = [mask("A", cd=32), mask("B", "A")]
    pair = {"name": "p", "rule": "spacing", "between": ["A", "B"], "drawn": 100}
    found = entry(margins_of(bare_flow(masks, [pair], **THREE_SIGMA)), "p")
    assert Figure("16", 16.0, "half of the full width").agrees_with(found.residual.random)


def test_enclosure_budget():
    masks = [mask("OUT", cd=32), mask("IN", [{"mask": "OUT", "alignment": 45}], cd=32)]
    pair = {"name": "p", "rule": "enclosure", "inner": "IN", "outer": "OUT", "drawn": 55}
    found = entry(margins_of(bare_flow(masks, [pair], **THREE_SIGMA)), "p")
    root = math.sqrt(45**2 + 2 * 16**2)
    assert Figure("50.36864", root, "overlay and two edges").agrees_with(found.need.rss)
    assert Figure("4.631", 55 - root, "what is left").agrees_with(found.margin.rss)
    assert Figure("77", 77.0, "everything added").agrees_with(found.need.linear)
    assert Figure("-22", -22.0, "everything added").agrees_with(found.margin.linear)
    assert Figure("1.091949", 55 / root, "room over three sigma").agrees_with(found.cpk)
    tail = Figure("5.26727e-4", norm.sf(55 / (root / 3)), "one side, scipy")
    assert tail.agrees_with(found.fail_probability / 2)

"""What must not change an answer, and what must change it in a known way."""

import copy
import math
from dataclasses import astuple, replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from flowplan.report.records import margins_document
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.random_flows import Dice, flows
from tests.support.rewritten import lengths_in, quantities_changed, renamed, scaled


def figures(entry):
    """Everything that is a number and has nothing to do with names."""
    return (
        entry.drawn, entry.keep, entry.nominal, entry.residual, entry.overlay, entry.need, entry.margin,
        entry.verdict, entry.cpk, entry.fail_probability, entry.point, entry.chain_rss,
        tuple((r.coefficient, r.contribution, r.share) for r in entry.sources),
    )  # fmt: skip


def same(one, two):
    """Whether two entries agree but for the last bits, which the place in an array may change."""
    for name in ("residual", "overlay", "need"):
        a, b = astuple(getattr(one, name)), astuple(getattr(two, name))
        assert b == pytest.approx(a, rel=1e-12, abs=1e-12)
    assert (two.chain, two.point, two.verdict) == (one.chain, one.point, one.verdict)
    assert {r.source for r in two.sources} == {r.source for r in one.sources}


@given(data=flows())
def test_names_mean_nothing(data):
    other = margins_of(renamed(data, lambda name: f"{name[::-1]}'"))
    for one, two in zip(margins_of(data).entries, other.entries, strict=True):
        assert figures(one) == figures(two)
        assert [f"{n[::-1]}'" if n != "wafer" else n for n in one.chain.layers] == list(two.chain.layers)


@given(data=flows(), shift=st.integers(1, 3))
def test_pairs_do_not_know_of_each_other(data, shift):
    """In another order, and one alone, every pair has the same figures."""
    turned = {**data, "pairs": data["pairs"][shift:] + data["pairs"][:shift]}
    by_name = {}
    for e in margins_of(turned).entries:
        by_name.setdefault((e.pair.name, e.layers, e.axis), e)
    entries = margins_of(data).entries
    assert len(by_name) == len(entries)
    for one in entries:
        same(one, by_name[one.pair.name, one.layers, one.axis])


@given(data=flows())
def test_the_file_s_unit_is_only_a_way_of_writing(data):
    """Every bare length gets its unit spelled out, then the file's unit changes."""
    other = "um" if data["unit"] == "nm" else "nm"
    here, there = margins_of(data), margins_of(lengths_in(data, other))
    for one, two in zip(here.entries, there.entries, strict=True):
        assert one.verdict == two.verdict
        assert one.need.mixed == pytest.approx(two.need.mixed, rel=1e-12, abs=1e-9)
        assert one.point == two.point
    factor = 1e-3 if other == "um" else 1e3
    for one, two in zip(margins_document(here)["margins"], margins_document(there)["margins"], strict=True):
        for key in ("offset", "bound", "random"):
            assert two[key] == pytest.approx(one[key] * factor, rel=1e-11, abs=1e-9)


@given(data=flows(), power=st.sampled_from((-3, 1, 5)))
def test_errors_and_drawn_lengths_twice_as_large_give_everything_twice(data, power):
    """Powers of 2, so that nothing is rounded in another way; ratios stay what they are."""
    factor = 2.0**power
    for one, two in zip(margins_of(data).entries, margins_of(scaled(data, factor)).entries, strict=True):
        assert two.need.mixed == one.need.mixed * factor
        assert two.overlay.random == one.overlay.random * factor
        assert (two.cpk, two.fail_probability, two.verdict) == (one.cpk, one.fail_probability, one.verdict)
        assert two.point == one.point
        if one.margin is not None:
            assert two.margin.rss == one.margin.rss * factor


@given(data=flows())
def test_turning_a_pair_round_turns_the_sign_of_its_overlay(data):
    """e_ab = -e_ba; what takes the drawn dimension stays where edges enter alike."""
    keys = ("spacing", "overlap", "overlay")
    kept = [p for p in data["pairs"] if p["rule"] in keys]
    turned = [{**p, "between": p["between"][::-1]} for p in kept]
    here = {(e.pair.name, e.layers, e.axis): e for e in margins_of({**data, "pairs": kept}).entries}
    for e in margins_of({**data, "pairs": turned}).entries:
        one = here[e.pair.name, e.layers[::-1], e.axis]
        overlay = replace(one.overlay, offset=-one.overlay.offset)
        assert astuple(e.overlay) == pytest.approx(astuple(overlay), rel=1e-12, abs=1e-12)
        assert astuple(e.need) == pytest.approx(astuple(one.need), rel=1e-12, abs=1e-12)


@given(data=flows())
def test_two_independent_terms_may_be_merged_in_variance(data):
    """A random part of 5 is one of 3 and one of 4, wherever it stands and whatever it shares."""
    parts = copy.deepcopy(data)
    holders = [*parts["tools"].values(), *parts["masks"]]
    for holder in holders:
        for name, term in list(holder["terms"].items()):
            if not isinstance(term, dict) or "random" not in term:
                continue
            for share, suffix in ((0.6, "a"), (0.8, "b")):
                source = {"source": term["source"] + suffix} if "source" in term else {}
                random = {"random": quantities_changed(term["random"], lambda q, s=share: times(q, s), True)}
                keep = {k: v for k, v in term.items() if k not in ("uniform", "bound", "offset")}
                holder["terms"][name + suffix] = keep | random | source
            rest = {k: v for k, v in term.items() if k != "random"}
            del holder["terms"][name]
            if set(rest) & {"uniform", "bound", "offset"}:
                holder["terms"][name] = rest
    for one, two in zip(margins_of(data).entries, margins_of(parts).entries, strict=True):
        assert two.overlay.random == pytest.approx(one.overlay.random, rel=1e-9, abs=1e-9)
        assert two.residual.random == pytest.approx(one.residual.random, rel=1e-9, abs=1e-9)


def times(quantity, factor):
    if isinstance(quantity, str):
        number, unit = quantity.split()
        return f"{float(number) * factor!r} {unit}"
    return quantity * factor


@given(data=flows())
def test_what_is_printed_later_changes_nothing(data):
    added = copy.deepcopy(data)
    last = copy.deepcopy(data["masks"][-1])
    added["masks"].append({**last, "id": "LATER", "aligns_to": data["masks"][-1]["id"]})
    for one, two in zip(margins_of(data).entries, margins_of(added).entries, strict=True):
        same(one, two)


@given(data=flows())
def test_a_new_independent_error_never_makes_a_pair_better(data):
    more = copy.deepcopy(data)
    for i, m in enumerate(more["masks"]):
        m["terms"][f"new{i}"] = {"random": 12, "bound": 3}
    for one, two in zip(margins_of(data).entries, margins_of(more).entries, strict=True):
        before, after = (e.need.on(data["basis"]) - e.residual.offset for e in (one, two))
        assert after >= before - 1e-9 * (1 + abs(before))


@given(data=flows())
def test_a_self_aligned_feature_lies_exactly_on_what_it_follows(data):
    """No placement error at all, to the last bit, and the same overlay as its parent to others."""
    for feature in data["self_aligned"]:
        follows = feature["follows"]
        for axis in "xy":
            parent = follows if isinstance(follows, str) else follows[axis]
            others = [m["id"] for m in data["masks"] if m["id"] != parent]
            pairs = [overlay_pair(parent, feature["id"], axes=axis)]
            pairs += [
                overlay_pair(name, other, axes=axis) for other in others for name in (parent, feature["id"])
            ]
            first, *rest = margins_of({**data, "pairs": pairs}).entries
            assert (first.overlay.offset, first.overlay.bound, first.overlay.random) == (0.0, 0.0, 0.0)
            assert (first.sources, first.point) == ((), None)
            for to_parent, to_feature in zip(rest[::2], rest[1::2], strict=True):
                expected = astuple(to_parent.overlay)
                assert astuple(to_feature.overlay) == pytest.approx(expected, rel=1e-12, abs=1e-12)


@st.composite
def two_on_one_mark(draw):
    """Any flow, then two masks without errors of their own that read the same marks on one tool."""
    data = draw(flows())
    dice = Dice(draw)
    terms = {f"t{i}": dice.term(True, {}) for i in range(3)}
    wholly = {
        n: (t if isinstance(t, dict) and not set(t) <= {"x", "y"} else {"random": t}) | {"common": 1}
        for n, t in terms.items()
    }
    read = dice.pick(*(m["id"] for m in data["masks"]))
    side = dice.pick("front", "back")
    siblings = [mask(name, read, "repeater", side=side) for name in ("ONE", "TWO")]
    masks = [{**m, "mark_reading": 0} if m["id"] == read else m for m in data["masks"]]
    return {**data, "tools": {**data["tools"], "repeater": {"terms": wholly}}, "masks": [*masks, *siblings]}


@given(data=two_on_one_mark())
def test_siblings_on_one_tool_whose_errors_all_repeat_lie_exactly_on_each_other(data):
    (x, y) = margins_of({**data, "pairs": [overlay_pair("ONE", "TWO", limit=0)]}).entries
    for found in (x, y):
        assert (found.overlay.offset, found.overlay.bound, found.overlay.random) == (0.0, 0.0, 0.0)
        assert found.margin.linear == 0.0
        assert (found.cpk, found.fail_probability, found.verdict) == (math.inf, 0.0, "pass")
        assert found.sources == ()


@given(weights=st.lists(st.integers(1, 97), min_size=2, max_size=6))
def test_an_average_over_masks_with_one_common_error_keeps_all_of_it(weights):
    """And cancels it to exactly 0 against any of them, whatever the weights round to."""
    total = sum(weights)
    terms = {"chuck": {"random": 37.1, "source": "chuck"}}
    several = [mask(f"R{i}", terms=terms) for i in range(len(weights))]
    read = [{"mask": f"R{i}", "weight": w / total} for i, w in enumerate(weights)]
    pairs = [overlay_pair(f"R{i}", "MEAN") for i in range(len(weights))]
    result = margins_of(bare_flow([*several, mask("MEAN", read)], pairs))
    for i in range(len(weights)):
        assert entry(result, f"R{i}-MEAN").overlay.random == 0.0

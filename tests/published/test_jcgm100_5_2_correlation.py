"""JCGM 100:2008 (GUM), 5.2.2: the law of propagation for correlated inputs.

Two terms a and b with correlation r: u^2 = a^2 + b^2 + 2 r a b in a sum, minus in a difference.
Two masks' terms that name one `source` with `common: c` correlate by exactly c; a mask on the back
takes a shift along x with the sign turned, which gives -c there. The figures for a = 3, b = 4 are
computed from the law. The ten resistors of the clause's example are from memory.
"""

import math
from itertools import pairwise

import pytest

from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.published import Figure

SUMS = {-1.0: "1", -0.5: "3.605551", 0.0: "5", 0.5: "6.082763", 1.0: "7"}


def two_terms(correlation):
    """A and B carry the terms; SUM is printed after both, so it holds them added."""
    share = abs(correlation)
    side = "back" if correlation < 0 else "front"

    def term(size):
        return {"t": {"random": size, "source": "common cause", "common": share}}

    masks = [
        mask("REF"),
        mask("A", "REF", terms=term(3)),
        mask("B", "REF", terms=term(4), side=side),
        mask("SUM", "A", terms=term(4), side=side),
    ]
    return margins_of(bare_flow(masks, [overlay_pair("REF", "SUM"), overlay_pair("A", "B")]))


@pytest.mark.parametrize("correlation", SUMS)
def test_sum_and_difference(correlation):
    result = two_terms(correlation)
    exact = math.sqrt(25 + 24 * correlation)
    added = entry(result, "REF-SUM", "x").overlay.random
    apart = entry(result, "A-B", "x").overlay.random
    assert Figure(SUMS[correlation], exact, "law of propagation").agrees_with(added)
    assert Figure(SUMS[-correlation], math.sqrt(25 - 24 * correlation), "same, r turned").agrees_with(apart)


@pytest.mark.parametrize("correlation", [-1.0, -0.5])
def test_the_back_side_turns_the_sign_along_x_only(correlation):
    result = two_terms(correlation)
    assert entry(result, "REF-SUM", "y").overlay.random == pytest.approx(
        math.sqrt(25 - 24 * correlation), rel=1e-12
    )


@pytest.mark.parametrize("share", [0.0, 0.25, 0.8, 1.0])
def test_any_share_in_between(share):
    result = two_terms(share)
    assert entry(result, "A-B").overlay.random == pytest.approx(math.sqrt(25 - 24 * share), rel=1e-12)


def ten_in_a_row(**more):
    """Ten masks, each 0.1 away from the one before, as ten resistors in series."""
    names = ["REF", *(f"R{i}" for i in range(10))]
    terms = {"calibration": {"random": 0.1, **more}}
    masks = [mask("REF"), *(mask(b, a, terms=terms) for a, b in pairwise(names))]
    result = margins_of(bare_flow(masks, [overlay_pair("REF", "R9")]))
    return entry(result, "REF-R9")


def test_ten_resistors_against_one_standard():
    figure = Figure("1", 1.0, "ten times one source adds up as a length")
    assert figure.agrees_with(ten_in_a_row(source="standard").overlay.random)


def test_ten_resistors_as_if_independent():
    figure = Figure("0.32", math.sqrt(10) / 10, "the answer that the clause calls wrong")
    assert figure.agrees_with(ten_in_a_row().overlay.random)


def test_hand_calculation_along_the_chain_makes_that_mistake():
    assert ten_in_a_row(source="standard").chain_rss == pytest.approx(math.sqrt(10) / 10, rel=1e-12)

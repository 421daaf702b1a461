"""How numbers and names are worded: digits, signs, rests, lists."""

import math

import pytest

from flowplan.report.viewbase import (
    Base,
    capability,
    counted,
    decimals_for,
    listed,
    number,
    per_million,
    percent,
)
from tests.support.flows import Data, bare_flow, margins_of, mask, overlay_pair


def base_of(unit: str, alignment: object) -> Base:
    data: Data = bare_flow([mask("A"), mask("B", "A")], [overlay_pair("A", "B", limit="1 um")], unit=unit)
    return Base(margins_of(data | {"tools": {"tool": {"alignment": alignment}}}))


@pytest.mark.parametrize(
    ("values", "finest", "decimals"),
    [
        ([], 0.01, 1),
        ([], 1.0, 0),
        ([123.4, 127.9, 1500.0], 0.01, 1),
        ([1.234], 0.01, 2),
        ([1.234], 1e-5, 3),
        ([12345.0], 0.01, 0),
        ([0.0, 0.0], 0.01, 1),
        ([-0.0123], 1e-5, 5),
    ],
)
def test_decimals_show_four_digits_of_the_middle_but_nothing_finer_than_the_finest(
    values: list[float], finest: float, decimals: int
) -> None:
    assert decimals_for(values, finest) == decimals


@pytest.mark.parametrize(
    ("value", "decimals", "shown"),
    [
        (12.345, 1, "12.3"),
        (-12.345, 2, "\N{MINUS SIGN}12.35"),
        (0.0, 2, "0"),
        (-0.0, 2, "0"),
        (0.0004, 2, "4e\N{MINUS SIGN}04"),
        (-0.0004, 2, "\N{MINUS SIGN}4e\N{MINUS SIGN}04"),
    ],
)
def test_number(value: float, decimals: int, shown: str) -> None:
    assert number(value, decimals) == shown


@pytest.mark.parametrize(
    ("share", "shown"), [(0.0, "0 %"), (0.004, "<1 %"), (0.006, "1 %"), (0.5, "50 %"), (1.3, "130 %")]
)
def test_percent(share: float, shown: str) -> None:
    assert percent(share) == shown


@pytest.mark.parametrize(
    ("cpk", "shown"),
    [
        (None, "–"),
        (math.inf, "∞"),
        (-math.inf, "\N{MINUS SIGN}∞"),
        (1.333, "1.33"),
        (-0.5, "\N{MINUS SIGN}0.50"),
    ],
)
def test_capability(cpk: float | None, shown: str) -> None:
    assert capability(cpk) == shown


@pytest.mark.parametrize(
    ("probability", "shown"),
    [(None, "–"), (0.0, "0"), (1e-12, "<0.001"), (2.7e-3, "2700"), (6.33e-5, "63.3"), (1.0, "1000000")],
)
def test_per_million(probability: float | None, shown: str) -> None:
    assert per_million(probability) == shown


@pytest.mark.parametrize(
    ("words", "shown"),
    [
        ([], ""),
        (["a"], "a"),
        (["a", "b"], "a and b"),
        (["a", "b", "c"], "a, b and c"),
        (["a", "b", "c", "d"], "a, b, c and d"),
        (["a", "b", "c", "d", "e"], "a, b, c and 2 more"),
    ],
)
def test_lists_in_a_sentence_count_only_what_is_worth_it(words: list[str], shown: str) -> None:
    assert listed(words, 3) == shown


def test_counted() -> None:
    assert [counted(1, "mask"), counted(2, "mask"), counted(2, "die", "dice")] == [
        "1 mask",
        "2 masks",
        "2 dice",
    ]


def test_lengths_are_in_the_unit_of_the_file_with_its_sign() -> None:
    base = base_of("um", "0.25 um")
    assert base.decimals == 4
    assert base.length(1500.0) == "1.5000"
    assert base.length(None) == base.length(math.inf) == base.signed(None) == "–"
    assert [base.signed(v) for v in (1500.0, -1500.0, 0.0)] == ["+1.5000", "\N{MINUS SIGN}1.5000", "0"]
    assert base.plus_minus(10.0) == "±0.0100"


def test_names_lead_to_rows_and_the_wafer_has_none() -> None:
    names = base_of("nm", 5).names
    assert {name: layer.anchor for name, layer in names.items()} == {"wafer": "", "A": "m1", "B": "m2"}

"""Units: one closed list, read and converted in one place."""

import math

import pytest

from flowplan.units import (
    LENGTH_UNITS,
    UNITS,
    Quantity,
    UnitError,
    canonical_unit,
    convert,
    parse_quantity,
    significant,
)


@pytest.mark.parametrize(
    ("text", "value", "unit"),
    [
        ("120", 120.0, None),
        ("0.12 um", 0.12, "um"),
        ("0.12um", 0.12, "um"),
        ("  -3 ppm ", -3.0, "ppm"),
        ("+.5 urad", 0.5, "urad"),
        ("5. mm", 5.0, "mm"),
        ("1e3 nm", 1000.0, "nm"),
        ("1E-3 in", 0.001, "in"),
        ("2 \N{MICRO SIGN}m", 2.0, "um"),
        ("2 \N{GREEK SMALL LETTER MU}rad", 2.0, "urad"),
        ("0.5 degC", 0.5, "degC"),
    ],
)
def test_text_is_a_number_with_an_optional_unit(text, value, unit):
    assert parse_quantity(text) == Quantity(value, unit)


@pytest.mark.parametrize("text", ["", "um", "1,5 um", "1 2 um", "--1 um", "1e um", "nan", "inf nm", "0x10"])
def test_other_text_is_refused_with_what_to_write(text):
    with pytest.raises(UnitError) as caught:
        parse_quantity(text)
    assert caught.value.code in ("FP203", "FP401")
    assert caught.value.hint


def test_no_number_and_no_such_unit_are_told_apart():
    with pytest.raises(UnitError, match="is not a number") as no_number:
        parse_quantity("twelve um")
    with pytest.raises(UnitError, match="unknown unit 'furlong'") as no_unit:
        parse_quantity("12 furlong")
    assert (no_number.value.code, no_unit.value.code) == ("FP203", "FP401")
    assert no_unit.value.message == str(no_unit.value)
    assert all(name in no_unit.value.hint for name in UNITS)


def test_unit_names_are_case_sensitive():
    """mm and Mm differ by nine powers of ten."""
    with pytest.raises(UnitError):
        canonical_unit("Mm")


def test_the_micro_sign_has_one_plain_spelling():
    assert canonical_unit("\N{MICRO SIGN}m") == canonical_unit("\N{GREEK SMALL LETTER MU}m") == "um"


def test_the_closed_list_of_lengths():
    assert LENGTH_UNITS == ("nm", "um", "mm", "cm", "in")


@pytest.mark.parametrize(
    ("value", "unit", "to", "expected"),
    [
        (1, "um", "nm", 1e3),
        (1, "mm", "um", 1e3),
        (1, "cm", "mm", 10),
        (1, "in", "mm", 25.4),  # exact by definition of the inch
        (1, "mrad", "urad", 1e3),
        (1, "ppm", "ppb", 1e3),
        (120, "nm", "um", 0.12),
        (7, "nm", "", 7),
        (7, "ppb", "", 0.007),
        (2, "in", "", 50.8e6),
        (-3, "cm", "nm", -3e7),
    ],
)
def test_conversion(value, unit, to, expected):
    assert convert(value, unit, to) == expected


@pytest.mark.parametrize("value", [0.1, 0.12, 0.3, 0.7, 1.1, 4.35, 17.3])
def test_there_and_back_is_the_same_decimal(value):
    assert convert(convert(value, "um", "nm"), "nm", "um") == value


def test_dimensions_do_not_mix():
    with pytest.raises(ValueError, match="nm is a length, urad a angle"):
        convert(1, "nm", "urad")


def test_one_urad_and_one_ppm_over_one_mm_are_one_nm():
    """The reason why the arithmetic carries no factor: 1e-6 x 1 mm = 1 nm."""
    assert 1e-6 * convert(1, "mm", "nm") == 1
    assert (UNITS["urad"], UNITS["ppm"]) == (("angle", 1.0), ("ratio", 1.0))


def test_a_bare_number_is_a_length_in_the_files_unit():
    bare = Quantity(1.5)
    assert bare.dimension == "length"
    assert (bare.in_base("um"), bare.in_base("nm")) == (1500, 1.5)


def test_a_written_unit_wins_over_the_files():
    assert Quantity(2, "ppb").in_base("um") == 0.002
    assert Quantity(2, "nm").in_base("mm") == 2
    assert Quantity(3, "K").dimension == "temperature"


@pytest.mark.parametrize(
    ("quantity", "text"),
    [(Quantity(0.12, "um"), "0.12 um"), (Quantity(90.0), "90"), (Quantity(0.1 + 0.2, "ppm"), "0.3 ppm")],
)
def test_a_quantity_writes_itself_as_it_can_be_read(quantity, text):
    assert str(quantity) == text


@pytest.mark.parametrize(
    ("value", "digits", "expected"),
    [
        (0.1 + 0.2, 12, 0.3),
        (123456, 2, 120000),
        (-1.23456e-7, 3, -1.23e-7),
        (math.inf, 12, math.inf),
        (-math.inf, 12, -math.inf),
    ],
)
def test_significant_digits(value, digits, expected):
    assert significant(value, digits) == expected


def test_zero_has_no_sign_and_nan_stays():
    assert math.copysign(1, significant(-0.0)) == 1
    assert math.isnan(significant(math.nan))

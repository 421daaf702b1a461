"""Words that say what was meant: units people write by habit, keys, wrong types."""

import pytest

from flowplan.errors import Diagnostic, in_brief, nearest
from flowplan.model.build import build, follow
from flowplan.model.formwords import key_hint, type_hint, without_echoes
from flowplan.model.salvage import salvage
from flowplan.model.unitwords import unit_hint
from flowplan.units import UnitError, canonical_unit


@pytest.mark.parametrize(
    ("unit", "hint"),
    [
        ("micron", "did you mean 'um'?"),
        ("Micrometer", "did you mean 'um'?"),
        ("µ", "did you mean 'um'?"),
        ("inches", "did you mean 'in'?"),
        ("NM", "did you mean 'nm'?"),
        ("pppm", "did you mean 'ppm'?"),
        ("Å", "1 Å is 0.1 nm"),
        ("mil", "1 mil is 0.001 in"),
        ("rad", "1 rad is 1000 mrad"),
        ("parsec", "known units: nm, um, mm, cm, in, urad, mrad, ppm, ppb, degC, K"),
    ],
)
def test_an_unknown_unit_leads_to_the_one_that_is_meant(unit, hint):
    with pytest.raises(UnitError) as error:
        canonical_unit(unit)
    assert unit_hint(error.value, unit) == hint


@pytest.mark.parametrize(
    ("kind", "given", "hint"),
    [
        ("string_type", 8, "put it in quotes"),
        ("string_type", None, "nothing stands after the `:`; fill it in, or leave the key out"),
        ("string_type", [1], "write one text"),
        ("tuple_type", {"a": 1}, "begin each entry with a dash: `- {key: value}`"),
        ("tuple_type", "a", "write `[…]`, or a dash before each entry"),
        ("dict_type", ["a"], "write `name: …` without a dash"),
        ("dict_type", "a", "write `{key: value}`, or the keys below, indented"),
    ],
)
def test_a_wrong_type_leads_to_the_right_one(kind, given, hint):
    assert type_hint(kind, given) == hint


def test_a_mapping_is_asked_for_with_the_keys_that_it_needs():
    assert type_hint("model_type", 3, ["x", "y"]) == "write `{x: …, y: …}`, or the keys below, indented"


def test_a_key_that_nothing_follows_may_be_an_entry_of_a_list():
    assert key_hint("GATE", ["id", "tool"], None) == (
        "several values need brackets: `[A, B]`; otherwise: known here: id, tool"
    )
    assert key_hint("tol", ["id", "tool"], 3) == "did you mean 'tool'?"


def test_a_missing_key_that_stands_there_misspelt_is_told_once():
    misspelt = Diagnostic("FP201", "unknown key 'ids'", "did you mean 'id'?", ("masks", 0, "ids"))
    missing = Diagnostic("FP202", "'id' is missing", "add it", ("masks", 0))
    elsewhere = Diagnostic("FP202", "'id' is missing", "add it", ("masks", 1))
    assert without_echoes((misspelt, missing, elsewhere)) == (misspelt, elsewhere)


def test_the_nearest_of_thousands_is_found_by_beginning_and_end():
    known = [f"LAYER{i}_METAL" for i in range(5000)]
    assert nearest("LAYER4711_METL", known) == "did you mean 'LAYER4711_METAL'?"
    assert nearest("AYER4711_METAL", known) == "did you mean 'LAYER4711_METAL'?"
    assert nearest("?", known).startswith("known here: LAYER0_METAL, LAYER1_METAL, ")


def test_a_word_too_long_to_be_a_slip_is_not_compared():
    assert nearest("GATE" * 100, ["GATE"]) == ""


def test_a_short_finding_is_left_alone():
    finding = Diagnostic("FP301", "unknown mask 'GTAE'", "did you mean 'GATE'?")
    assert in_brief(finding) == finding


def test_long_quotes_and_messages_are_cut_in_the_middle():
    cut = in_brief(Diagnostic("FP301", f"unknown mask {'a' * 90!r}", "x " * 500))
    assert cut.message == f"unknown mask '{'a' * 43}…{'a' * 14}'"
    assert len(cut.hint) == 300


@pytest.mark.parametrize(
    ("path", "found"), [((), {"a": [1]}), (("a", 0), 1), (("a", 1), None), (("b",), None), (("a", "x"), None)]
)
def test_what_stands_at_a_path(path, found):
    assert follow({"a": [1]}, path) == found


@pytest.mark.parametrize("data", [None, 3, "flow", [], [{}]])
def test_what_is_no_mapping_is_refused_and_leaves_nothing(data):
    flow, findings = build(data)
    assert flow is None
    assert [d.code for d in findings] == ["FP203"]
    assert salvage(data, findings).flow is None


def test_numbers_beyond_a_float_are_not_finite():
    data = {
        "flow": "Estuary",
        "masks": [],
        "sigma": 10**400,
        "reserve": 10**400,
        "wafer": {"diameter": 10**400},
    }
    _, findings = build(data)
    assert {(d.code, d.path) for d in findings} == {
        ("FP207", ("sigma",)), ("FP207", ("reserve",)), ("FP207", ("wafer", "diameter")),
    }  # fmt: skip

"""Diagnostics: one finding with its place, and the errors that carry them."""

import pytest

from flowplan.errors import (
    CODES,
    Diagnostic,
    FlowError,
    FlowplanError,
    OutputError,
    Span,
    UsageError,
    in_brief,
    nearest,
)


def test_a_finding_says_where_what_and_which_code():
    found = Diagnostic("FP301", "unknown mask 'B'", span=Span("a.yaml", 3, 7))
    assert str(found) == "a.yaml:3:7: unknown mask 'B' [FP301]"


def test_a_warning_says_so_and_a_place_may_be_unknown():
    assert str(Diagnostic("FP309", "no effect", severity="warning")) == "warning: no effect [FP309]"


def test_placing_a_finding_leaves_the_original_alone():
    found = Diagnostic("FP301", "message", "hint", ("masks", 1))
    placed = found.at(Span("a.yaml", 1, 2))
    assert (found.span, placed.span) == (None, Span("a.yaml", 1, 2))
    assert (placed.code, placed.message, placed.hint, placed.path) == (
        "FP301",
        "message",
        "hint",
        ("masks", 1),
    )


@pytest.mark.parametrize("kind", [FlowError, UsageError, OutputError])
def test_every_error_holds_all_its_findings(kind):
    findings = [Diagnostic("FP301", "one"), Diagnostic("FP302", "two")]
    error = kind(iter(findings))
    assert isinstance(error, FlowplanError)
    assert error.diagnostics == tuple(findings)
    assert str(error) == "one [FP301]\ntwo [FP302]"


def test_codes_are_numbered_by_group_and_described():
    assert all(code.startswith("FP") and code[2] in "1234567" and len(code) == 5 for code in CODES)
    assert len(set(CODES.values())) == len(CODES)
    assert all(text == text.strip() and not text.endswith(".") for text in CODES.values())


@pytest.mark.parametrize(
    ("word", "known", "hint"),
    [
        ("METAl1", ["METAL1", "METAL2"], "did you mean 'METAL1'?"),  # letters count more than their case
        ("aligment", ["alignment", "terms"], "did you mean 'alignment'?"),
        ("zebra", ["A", "B"], "known here: A, B"),
        ("zebra", [], ""),
    ],
)
def test_nearest_word(word, known, hint):
    assert nearest(word, known) == hint


def test_of_words_that_differ_in_case_alone_the_first_is_meant():
    assert nearest("gate", ["Gate", "GATE"]) == "did you mean 'Gate'?"


def test_a_long_list_is_cut():
    known = [f"M{i:02}" for i in range(13)]
    assert nearest("zebra", known) == "known here: " + ", ".join(known[:12]) + ", …"
    assert nearest("zebra", known[:12]) == "known here: " + ", ".join(known[:12])


class TestTextOfAnyLength:
    def test_a_short_finding_stays_as_it_is(self):
        finding = Diagnostic("FP301", "unknown mask 'GATF'", "did you mean 'GATE'?")
        assert in_brief(finding) == finding

    def test_a_long_quote_loses_its_middle(self):
        found = in_brief(Diagnostic("FP301", f"unknown mask '{'A' * 50}{'B' * 950}'"))
        assert found.message.startswith("unknown mask 'AAAA")
        assert found.message.endswith("BBB'")
        assert "…" in found.message
        assert len(found.message) == len("unknown mask ") + 60

    def test_a_long_message_without_quotes_is_cut_as_well(self):
        assert len(in_brief(Diagnostic("FP301", "x" * 5000, "y" * 5000)).message) == 300


class TestNearestAmongMany:
    NAMES = tuple(f"LAYER{i}" for i in range(500))

    def test_finds_one_among_hundreds(self):
        assert nearest("LAYRE417", self.NAMES) == "did you mean 'LAYER417'?"

    def test_lists_the_first_where_nothing_is_near(self):
        hint = nearest("q", self.NAMES)
        assert hint.startswith("known here: LAYER0, LAYER1, ")
        assert hint.endswith("LAYER11, …")

    def test_does_not_compare_a_word_without_end(self):
        assert nearest("L" * 10_000, self.NAMES) == ""

    def test_knows_nothing_where_nothing_is_known(self):
        assert nearest("GATE", []) == ""

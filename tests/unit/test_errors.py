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

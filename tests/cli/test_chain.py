"""``flowplan chain`` explains the overlay of two layers."""

import json

import pytest

FLOW = """\
flow: Estuary
tools:
  s: {alignment: 30, terms: {lens: {random: 40, enters: pattern, common: 1}}}
masks:
  - {id: A, tool: s, aligns_to: wafer, terms: {marks: {random: 12, enters: marks}}}
  - {id: B, tool: s, aligns_to: A}
  - {id: C, tool: s, aligns_to: {x: A, y: B}}
self_aligned:
  - {id: S, follows: B}
split_layers: {BC: [B, C]}
pairs:
  - {name: c on b, rule: overlay, between: [B, C], limit: 44}
"""


@pytest.fixture
def file(tmp_path):
    (tmp_path / "f.yaml").write_text(FLOW)
    return "f.yaml"


def test_it_shows_hops_what_cancels_sources_and_the_direct_reading(run, file):
    result = run("chain", file, "B", "C", "--axis", "x")
    assert (result.exit_code, result.stderr) == (0, "")
    assert result.stdout.splitlines() == [
        "C on B, along x",
        "lengths in nm: offset ± random at 3 sigma ± bounds",
        "",
        "Chain through A",
        "  B reads A  ± 32.3",
        "      alignment to A 30.0, marks (A) 12.0",
        "  C reads A  ± 32.3",
        "      alignment to A 30.0, marks (A) 12.0",
        "",
        "What cancels",
        "  source     kind    step by step  exact",
        "  lens (s)   random          56.6    0.0  gone",
        "  marks (A)  random          17.0    0.0  gone",
        "",
        "Where the overlay comes from",
        "  source              kind    amount   share",
        "  alignment to A (B)  random    30.0  50.0 %",
        "  alignment to A (C)  random    30.0  50.0 %",
        "",
        "  random, exact            42.4",
        "  random, plain chain RSS  45.7  7.7 % too large",
        "",
        "If C aligned directly to B along x",
        "                       now    then  verdict",
        "  overlay           ± 42.4  ± 30.0",
        "  margin of c on b     1.6    14.0  pass",
        "  whole flow, mixed basis: 2 pass, 0 fail, before and after",
    ]


def test_both_axes_are_shown_when_none_is_named(run, file):
    lines = run("chain", file, "B", "C").stdout.splitlines()
    assert lines[0] == "C on B, along x"
    assert "C on B, along y" in lines
    assert lines[-1] == "C already aligns directly to B."


def test_every_line_fits_80_columns(run, file):
    assert max(map(len, run("chain", file, "A", "C").stdout.splitlines())) <= 80


def test_a_self_aligned_feature_says_why_it_cannot_read(run, file):
    text = run("chain", file, "A", "S", "--axis", "x").stdout
    assert "S follows B" in text
    assert "nothing: exactly the same place" in text
    assert text.splitlines()[-1] == ("S is self-aligned: it follows B and has no exposure to align.")


def test_json_tells_the_same_in_the_units_of_the_file(run, file, tmp_path):
    (tmp_path / "um.yaml").write_text(
        FLOW.replace("flow: Estuary", "flow: Estuary\nunit: um").replace("alignment: 30", "alignment: 30 nm")
    )
    (axis,) = json.loads(run("chain", file, "B", "C", "--axis", "x", "--format", "json").stdout)["axes"]
    assert axis["chain"] == ["B", "A", "C"]
    assert axis["overlay"]["random"] == pytest.approx(1800**0.5)
    assert axis["chain_rss"] == pytest.approx(2088**0.5)
    assert axis["excess"] == pytest.approx((2088 / 1800) ** 0.5 - 1)
    assert [(r["name"], r["effect"]) for r in axis["shared"]] == [("lens", "cancels"), ("marks", "cancels")]
    assert sum(row["share"] for row in axis["sources"]) == pytest.approx(1)
    assert axis["direct"]["overlay"]["after"]["random"] == pytest.approx(30)
    assert axis["direct"]["pairs"][0]["after"]["margin"]["mixed"] == pytest.approx(14)
    (micron,) = json.loads(run("chain", "um.yaml", "B", "C", "--axis", "x", "--format", "json").stdout)[
        "axes"
    ]
    assert micron["overlay"]["random"] == pytest.approx(1800**0.5 / 1000)


def test_the_wafer_may_be_one_end(run, file):
    assert run("chain", file, "wafer", "B", "--axis", "x").stdout.startswith("B on wafer, along x\n")


@pytest.mark.parametrize(
    ("first", "second", "told"),
    [
        ("A", "D", "unknown layer 'D' [FP601]"),
        ("a", "B", "unknown layer 'a' [FP601]\n    hint: did you mean 'A'?"),
        ("A", "A", "'A' is named twice [FP602]"),
        ("A", "BC", "'BC' is a split layer, not one mask [FP602]\n    hint: name one of B, C"),
    ],
)
def test_a_question_that_does_not_fit_gets_a_clear_answer(run, file, first, second, told):
    result = run("chain", file, first, second)
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr.startswith(f"flowplan: {told}")

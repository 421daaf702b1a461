"""``flowplan margins`` prints every margin, for people or for programs."""

import csv
import io
import json

import pytest

import flowplan


def names(result) -> list[str]:
    """The pair of each entry of the JSON output."""
    return [entry["pair"] for entry in json.loads(result.stdout)["margins"]]


def test_the_table_stands_in_file_order_and_names_the_unit_once(run, flow):
    result = run("margins", flow)
    assert result.exit_code == 0
    assert result.stdout.splitlines() == [
        "Estuary four masks, revision A",
        "lengths in nm, mixed basis, 3 sigma",
        "",
        "pair    layers  axis  through   need  margin  verdict",
        "first   A - B   x     direct   30.00   70.00  pass",
        "second  B - C   x     A        42.43    2.57  tight",
        "third   B - D   x     A        51.96   -1.96  fail",
        "fourth  A - D   x     A        42.43          unjudged",
        "",
        "1 pass, 1 tight, 1 fail, 1 unjudged",
        "worst: third along x, margin -1.96 nm, fail",
    ]


def test_sorting_by_margin_puts_the_least_first_and_the_unjudged_last(run, flow):
    result = run("margins", flow, "--sort", "margin", "--format", "json")
    assert names(result) == ["third", "second", "first", "fourth"]


def test_averaged_references_are_marked_as_one_of_several_ways(run, tmp_path):
    text = (
        "flow: Estuary\ntools: {s: {alignment: 30}}\nmasks:\n"
        "  - {id: A, tool: s, aligns_to: wafer}\n"
        "  - {id: B, tool: s, aligns_to: A}\n"
        "  - {id: C, tool: s, aligns_to: [A, B]}\n"
        "pairs: [{rule: overlay, between: [A, C], limit: 90, axes: x}]\n"
    )
    (tmp_path / "mean.yaml").write_text(text)
    lines = run("margins", "mean.yaml").stdout.splitlines()
    assert "direct *" in lines[4]
    assert lines[-1] == "* one of several ways: references are averaged"


def test_json_is_the_document_of_the_library(run, flow):
    document = json.loads(run("margins", flow, "--format", "json").stdout)
    assert document == json.loads(json.dumps(flowplan.analyse(flowplan.load(flow)).to_document()))
    assert list(document) == [
        "flow", "revision", "unit", "basis", "confidence", "variant", "counts", "margins",
    ]  # fmt: skip


def test_csv_has_one_row_an_entry_and_stable_columns(run, flow):
    rows = list(csv.DictReader(io.StringIO(run("margins", flow, "--format", "csv").stdout)))
    assert [row["pair"] for row in rows] == ["first", "second", "third", "fourth"]
    third = rows[2]
    assert (third["first"], third["second"], third["chain"]) == ("B", "D", "B > A > C > D")
    assert (third["unit"], third["verdict"], third["rule"]) == ("nm", "fail", "overlay")
    assert float(third["margin_mixed"]) == pytest.approx(50 - 30 * 3**0.5, abs=1e-9)
    assert float(third["chain_rss"]) == pytest.approx(30 * 3**0.5, abs=1e-9)
    assert rows[3]["margin_mixed"] == ""
    assert list(third) == [
        "pair", "rule", "first", "second", "axis", "chain", "through", "unit", "drawn", "keep", "nominal",
        "offset", "bound", "random", "overlay_offset", "overlay_bound", "overlay_random",
        "need_mixed", "need_rss", "need_linear", "margin_mixed", "margin_rss", "margin_linear",
        "verdict", "cpk", "fail_ppm", "point_X", "point_Y", "point_x", "point_y", "chain_rss",
    ]  # fmt: skip


def test_markdown_is_a_table_whose_headings_carry_the_unit(run, flow):
    lines = run("margins", flow, "--format", "markdown").stdout.splitlines()
    assert lines[0] == "| pair | layers | axis | through | need [nm] | margin [nm] | verdict |"
    assert lines[1] == "| --- | --- | --- | --- | ---: | ---: | --- |"
    assert lines[4] == "| third | B - D | x | A | 51.96 | -1.96 | fail |"


def test_markdown_escapes_what_would_break_the_table(run, tmp_path, flow):
    text = (tmp_path / flow).read_text().replace("name: first", 'name: "a|b<i>\\nc"')
    (tmp_path / "odd.yaml").write_text(text)
    lines = run("margins", "odd.yaml", "--format", "markdown").stdout.splitlines()
    assert len(lines) == 2 + 4
    assert lines[2].startswith(r"| a\|b\<i> c | A - B |")


def test_another_basis_judges_anew(run, flow):
    mixed = json.loads(run("margins", flow, "--format", "json").stdout)
    linear = json.loads(run("margins", flow, "--basis", "linear", "--format", "json").stdout)
    assert (mixed["basis"], linear["basis"]) == ("mixed", "linear")
    assert [e["verdict"] for e in mixed["margins"]] == ["pass", "tight", "fail", "unjudged"]
    assert [e["verdict"] for e in linear["margins"]] == ["pass", "fail", "fail", "unjudged"]


def test_layer_and_verdict_filters_are_unions_and_narrow_each_other(run, flow):
    def shown(*options):
        return names(run("margins", flow, "--format", "json", *options))

    assert shown("--layer", "D") == ["third", "fourth"]
    assert shown("--layer", "D", "--layer", "C") == ["second", "third", "fourth"]
    assert shown("--verdict", "fail", "--verdict", "tight") == ["second", "third"]
    assert shown("--layer", "D", "--verdict", "fail") == ["third"]
    assert shown("--layer", "C", "--verdict", "fail") == []


def test_a_split_layer_stands_for_each_of_its_masks(run, tmp_path, flow):
    text = (tmp_path / flow).read_text() + "split_layers: {CD: [C, D]}\n"
    (tmp_path / "split.yaml").write_text(text)
    assert names(run("margins", "split.yaml", "--format", "json", "--layer", "CD")) == [
        "second", "third", "fourth",
    ]  # fmt: skip


def test_nothing_left_by_the_filters_is_said(run, flow):
    result = run("margins", flow, "--layer", "C", "--verdict", "fail")
    assert "no pair fits what was asked for" in result.stdout


def test_an_unknown_layer_is_named_with_the_nearest(run, tmp_path, flow):
    text = (tmp_path / flow).read_text().replace("id: D", "id: METAL1").replace(", D]", ", METAL1]")
    (tmp_path / "metal.yaml").write_text(text)
    result = run("margins", "metal.yaml", "--layer", "METAL")
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr == ("flowplan: unknown layer 'METAL' [FP601]\n    hint: did you mean 'METAL1'?\n")


def test_every_pair_gives_the_overlay_of_every_two_layers(run, flow):
    document = json.loads(run("margins", flow, "--every-pair", "--format", "json").stdout)
    layers = [tuple(e["layers"]) for e in document["margins"] if e["axis"] == "y"]
    assert layers == [("A", "B"), ("A", "C"), ("A", "D"), ("B", "C"), ("B", "D"), ("C", "D")]
    overlays = {tuple(e["layers"]): e["overlay"]["random"] for e in document["margins"]}
    assert overlays["B", "D"] == pytest.approx(30 * 3**0.5)
    assert document["counts"]["unjudged"] == 12


def test_every_pair_as_a_table_has_no_empty_margin_column(run, flow):
    heading = run("margins", flow, "--every-pair").stdout.splitlines()[3]
    assert heading.split() == ["pair", "layers", "axis", "through", "overlay"]


def test_strict_looks_at_the_pairs_of_the_layers_asked_for(run, flow):
    assert run("margins", flow, "--strict").exit_code == 1
    assert run("margins", flow, "--strict", "--layer", "C").exit_code == 0
    assert run("margins", flow, "--strict", "--verdict", "pass").exit_code == 1


def test_strict_with_every_pair_is_refused_since_nothing_is_judged(run, flow):
    result = run("margins", flow, "--every-pair", "--strict")
    assert (result.exit_code, result.stdout) == (2, "")
    assert "[FP602]" in result.stderr


def test_a_formless_word_for_an_option_is_refused(run, flow):
    result = run("margins", flow, "--format", "xml")
    assert result.exit_code == 2
    assert "--format" in result.stderr

"""Landing pairs in JSON, tables, comparisons and the report."""

import csv
import io
import json

import pytest
from typer.testing import CliRunner

from flowplan.cli.main import app

FLOW = """\
flow: Estuary contacts
tools: {t: {alignment: 100, wafer_alignment: 500}}
masks:
  - {id: ACTIVE, tool: t, aligns_to: wafer}
  - {id: GATE, tool: t, aligns_to: ACTIVE, cd: 50}
  - {id: CONTACT, tool: t, aligns_to: ACTIVE, cd: 60}
pairs:
  - name: contact on gate pad
    rule: landing
    contact: {layer: CONTACT, x: 600, y: 600}
    pad: {layer: GATE, x: 700, y: 680}
    least_area: 0.7
    resistance: {nominal: 8, limit: 12}
    notes: <b>not</b> bold
  - {name: gate to active, rule: overlay, between: [ACTIVE, GATE], limit: 190}
variants:
  - name: direct
    masks: {CONTACT: {aligns_to: GATE}}
  - name: smaller pad
    pairs: {contact on gate pad: {pad: {layer: GATE, x: 500, y: 500}}}
"""


@pytest.fixture
def run(tmp_path, monkeypatch):
    (tmp_path / "f.yaml").write_text(FLOW, encoding="utf-8")
    monkeypatch.chdir(tmp_path)

    def command(*arguments):
        result = CliRunner().invoke(app, list(arguments), prog_name="flowplan")
        assert result.exit_code == 0, result.output
        return result.stdout

    return command


def test_the_record_of_a_landing(run):
    document = json.loads(run("margins", "f.yaml", "--format", "json"))
    first, *others = document["margins"]
    assert [m["axis"] for m in document["margins"]] == ["xy", "x", "y"]
    assert (first["rule"], first["layers"]) == ("landing", ["GATE", "CONTACT"])
    assert (first["need"], first["margin"], first["verdict"]) == (None, None, "pass")
    assert set(first) - set(others[0]) == {"landing", "allowed_ppm"}
    assert set(others[0]) <= set(first)
    found = first["landing"]
    assert set(found) == {
        "nominal_area", "mean_area", "area_quantiles", "p_below_least", "p_open", "resistance",
    }  # fmt: skip
    assert list(found["area_quantiles"]) == ["0.00135", "0.01", "0.5"]
    assert set(found["resistance"]) == {"nominal", "median", "q99", "p_above_limit"}
    assert first["fail_ppm"] == pytest.approx(found["p_below_least"] * 1e6)
    assert found["resistance"]["q99"] == pytest.approx(8 / found["area_quantiles"]["0.01"])
    assert document["counts"] == {"pass": 3, "tight": 0, "fail": 0, "unjudged": 0}


def test_an_open_has_no_resistance_in_json(run, tmp_path):
    missed = FLOW.replace("aligns_to: ACTIVE, cd: 60", "aligns_to: ACTIVE, terms: {off: {offset: 900}}")
    (tmp_path / "f.yaml").write_text(missed, encoding="utf-8")
    found = json.loads(run("margins", "f.yaml", "--format", "json"))["margins"][0]["landing"]
    assert (found["resistance"]["median"], found["resistance"]["q99"], found["p_open"]) == (None, None, 1)


def test_the_tables_fit_eighty_columns(run):
    lines = run("margins", "f.yaml").splitlines()
    assert max(map(len, lines)) <= 80
    (row,) = [line for line in lines if line.startswith("contact on gate")]
    assert row.split()[-1] == "pass"
    assert "3 pass, 0 fail" in lines


def test_filters_take_landings_too(run):
    assert "contact on gate" in run("margins", "f.yaml", "--layer", "CONTACT")
    assert "contact on gate" not in run("margins", "f.yaml", "--verdict", "fail")


def test_csv_gives_landings_columns_of_their_own(run):
    first, second, _ = csv.DictReader(io.StringIO(run("margins", "f.yaml", "--format", "csv")))
    assert (first["axis"], first["margin_mixed"], first["landing_nominal_area"]) == ("xy", "", "1.0")
    assert second["landing_nominal_area"] == ""


def test_check_counts_landings(run):
    assert "2, judged as 2 margins and 1 landing" in run("check", "f.yaml")


def test_compare_measures_landings_by_what_fails(run):
    document = json.loads(run("compare", "f.yaml", "--format", "json"))
    (row,) = [m for m in document["margins"] if m["axis"] == "xy"]
    assert row["status"] == [None, "better", "worse"]
    own, direct, smaller = row["fail_ppm"]
    assert direct < own < 2700 < smaller
    assert row["verdict"] == ["pass", "pass", "fail"]
    text = run("compare", "f.yaml")
    assert "pass to fail" in text or "fail" in text
    assert "of a landing: contacts that fail" in text


@pytest.mark.parametrize("command", ["levers", "remedies"])
def test_what_weighs_single_axes_says_so(run, command):
    assert "1 landing pair is left out" in run(command, "f.yaml")


def test_the_report_shows_the_landed_area_and_escapes_free_text(run, tmp_path):
    run("report", "f.yaml", "-o", "r.html")
    page = (tmp_path / "r.html").read_text(encoding="utf-8")
    section = page.split('<section id="landing"')[1].split("</section>")[0]
    assert "contact on gate pad" in section
    assert "&lt;b&gt;not&lt;/b&gt; bold" in section
    assert 'href="#landing"' in page
    assert "<td>xy<td>" in page.split('id="margin-table"')[1]


def test_a_report_without_landings_has_no_such_section(run, tmp_path):
    without = FLOW.replace(FLOW[FLOW.index("  - name: contact on") : FLOW.index("  - {name: gate to")], "")
    (tmp_path / "f.yaml").write_text(without[: without.index("variants")], encoding="utf-8")
    run("report", "f.yaml", "-o", "r.html")
    assert 'id="landing"' not in (tmp_path / "r.html").read_text(encoding="utf-8")

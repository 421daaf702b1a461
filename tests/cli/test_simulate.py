"""``flowplan simulate`` and the section that it gives the report."""

import json
import re
from pathlib import Path

import pytest
from scipy import stats


def test_table_shows_the_likeliest_first_within_80_columns(run, flow):
    result = run("simulate", flow, "--samples", "20000")
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert lines[0] == "Estuary four masks, revision A"
    assert "20000 samples, seed 1, bounds at their worst sign" in lines[1]
    assert [line.split()[0] for line in lines if re.match("(first|second|third) ", line)] == [
        "third",
        "second",
        "first",
    ]
    assert "fourth" not in result.stdout  # judged by no limit
    assert all(len(line) <= 80 for line in lines)
    for name in ("joint yield", "product of yields", "some pair fails", "wafers that hold"):
        assert any(line.startswith(name) for line in lines)


def test_json_document(run, flow):
    document = json.loads(
        run("simulate", flow, "--samples", "20000", "--seed", "7", "--format", "json").stdout
    )
    assert (document["samples"], document["seed"], document["bounds"]) == (20000, 7, "worst")
    low, high = document["joint_yield_interval"]
    assert low <= document["joint_yield"] <= high
    assert document["joint_yield"] > document["product_yield"]  # B is in all three pairs
    assert [p["pair"] for p in document["pairs"]] == ["first", "second", "third"]
    third = document["pairs"][2]
    assert (third["axis"], third["layers"]) == ("x", ["B", "D"])
    assert set(third) == {"pair", "axis", "layers", "fail", "interval", "closed_form", "rare", "quantiles"}
    exact = 2 * stats.norm.sf(50 / (10 * 3**0.5))
    assert third["closed_form"] == pytest.approx(exact)
    assert third["interval"][0] <= exact <= third["interval"][1]
    assert third["rare"]["fail"] == pytest.approx(exact, rel=4.2 * third["rare"]["relative_error"])
    assert list(third["quantiles"]) == ["0.00135", "0.01", "0.5", "0.99", "0.99865"]
    median = 50 - 10 * 3**0.5 * stats.norm.ppf(0.75)
    assert third["quantiles"]["0.5"] == pytest.approx(median, abs=0.5)
    assert 1 - document["rare"]["fail"] == pytest.approx(document["joint_yield"], abs=3e-3)
    assert document["fields"]["per_wafer"] == 1


def test_lengths_are_in_the_files_unit(run, flow):
    text = Path(flow).read_text().replace("unit: nm", "unit: um")
    Path("um.yaml").write_text(text)
    found = [
        json.loads(run("simulate", name, "--samples", "500", "--format", "json").stdout)["pairs"][0][
            "quantiles"
        ]
        for name in (flow, "um.yaml")
    ]
    assert found[0] == pytest.approx(found[1])


def test_markdown(run, flow):
    lines = run("simulate", flow, "--samples", "500", "--format", "markdown").stdout.splitlines()
    assert lines[0] == "# Estuary four masks, revision A: simulation"
    assert "| pair | axis | counted | 95 % interval | rare | closed form | 0.135 % |" in lines


@pytest.mark.parametrize(
    ("option", "value"), [("--samples", "0"), ("--seed", "-1"), ("--threads", "0"), ("--bounds", "best")]
)
def test_options_out_of_range_are_refused(run, flow, option, value):
    result = run("simulate", flow, option, value)
    assert (result.exit_code, result.stdout) == (2, "")
    assert option in result.stderr


def test_a_flow_that_judges_nothing_is_refused(run, flow):
    text = "\n".join(line for line in Path(flow).read_text().splitlines() if "limit" not in line)
    Path("bare.yaml").write_text(text)
    result = run("simulate", "bare.yaml")
    assert (result.exit_code, result.stdout) == (2, "")
    assert "no pair is judged: there is nothing to simulate [FP602]" in result.stderr


def test_help_shows_an_example(run):
    assert "Example: flowplan simulate flows/cmos.yaml" in run("simulate", "--help").stdout


def test_a_wafer_of_one_field_that_always_holds(run):
    Path("one.yaml").write_text(
        "flow: Estuary still\ntools: {s: {terms: {t: {offset: 3}}}}\nmasks:\n"
        "  - {id: A, tool: s, aligns_to: wafer}\n  - {id: B, tool: s, aligns_to: A}\n"
        "pairs:\n  - {name: p, rule: overlay, between: [A, B], limit: 5, axes: x}\n"
    )
    document = json.loads(run("simulate", "one.yaml", "--samples", "10", "--format", "json").stdout)
    assert document["joint_yield"] == document["product_yield"] == document["fields"]["share"] == 1
    assert set(document["pairs"][0]["quantiles"].values()) == {2.0}  # both masks have the offset, B twice
    assert document["pairs"][0]["rare"] == {"fail": 0, "relative_error": None}


def test_report_shows_the_simulation_only_when_asked(run, flow):
    assert run("report", flow, "-o", "plain.html").exit_code == 0
    assert 'id="simulation"' not in Path("plain.html").read_text()
    assert run("report", flow, "-o", "drawn.html", "--simulate", "2000").exit_code == 0
    page = Path("drawn.html").read_text()
    section = page[page.index('<section id="simulation"') :]
    section = section[: section.index("</section>")]
    assert '<a href="#simulation">' in page
    assert section.count('class="hist"') == 3
    assert "<script" not in section
    assert " style=" not in section  # the page's policy allows none


def test_map_of_good_fields_is_small(run):
    run("new", "starter.yaml")
    assert run("report", "starter.yaml", "-o", "drawn.html", "--simulate", "500").exit_code == 0
    page = Path("drawn.html").read_text()
    section = page[page.index('<section id="simulation"') :]
    section = section[: section.index("</section>")]
    assert "Good fields on the wafer" in section
    assert section.count("<ellipse") == 2
    assert "simulated wafers by how many of their fields hold" in section
    assert len(section) < 40_000

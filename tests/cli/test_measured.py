"""``flowplan measured`` holds data against the plan, writes it back, and makes data to try it on."""

import json

import pytest

SHAPED = """\
flow: Estuary two masks
revision: A
unit: nm
wafer: {diameter: 150 mm, edge_exclusion: 5 mm}
field: {x: 20 mm, y: 20 mm}
tools:
  stepper: {alignment: 60, terms: {stage: 30}}
masks:
  - {id: A, tool: stepper, aligns_to: wafer}
  - {id: B, tool: stepper, aligns_to: A}   # reads A
pairs:
  - {name: b on a, rule: overlay, between: [A, B], limit: 90}
"""
TERMS = {
    "wafer": ["shift_x", "shift_y", "scale_x", "scale_y", "rotation", "skew"],
    "field": ["magnification", "rotation", "magnification_asymmetry", "rotation_asymmetry"],
}


@pytest.fixture
def shaped(run, tmp_path):
    """Write a flow with a wafer, and data made from it with one bad row and one wild one."""
    (tmp_path / "two.yaml").write_text(SHAPED)
    made = run("measured", "two.yaml", "--make", "data.csv", "--lots", "2", "--wafers", "3", "--seed", "5")
    assert made.exit_code == 0, made.stderr
    with (tmp_path / "data.csv").open("a") as stream:
        stream.write("B,A,L1,1,0,0,0,0,oops,0\nB,A,L1,1,0,0,0,0,8000,0\n")
    return "two.yaml", "data.csv"


def document(run, *arguments):
    result = run("measured", *arguments, "--format", "json")
    assert result.exit_code == 0, result.stderr
    return json.loads(result.stdout)


def test_json_has_the_documented_keys(run, shaped):
    found = document(run, *shaped)
    assert list(found) == [
        "flow", "revision", "unit", "variant", "rows", "unreadable", "outliers", "readings", "sizes",
    ]  # fmt: skip
    (reading,) = found["readings"]
    assert (found["unreadable"], found["outliers"]) == (1, 1)
    assert reading["n"] == found["rows"] - 2
    assert (reading["mask"], reading["reference"]) == ("B", "A")
    assert (reading["lots"], reading["wafers"]) == (2, 6)
    for group, names in TERMS.items():
        assert list(reading[group]) == list(reading["errors"][group]) == names
    assert list(reading["variance"]) == ["lot", "wafer", "field", "site"]
    for axis in "xy":
        part = reading[axis]
        assert part["mean_plus_3sigma"] == pytest.approx(abs(part["mean"]) + part["three_sigma"])
        assert part["residual_three_sigma"] <= part["three_sigma"] * 1.01
        assert part["planned"]["three_sigma"] == pytest.approx((60**2 + 30**2) ** 0.5)
    middle = (reading["x"]["variance"]["field"] + reading["y"]["variance"]["field"]) / 2
    assert reading["variance"]["field"] == pytest.approx(middle)
    assert [(s["axis"], s["exceeded"]) for s in found["sizes"]] == [("x", False), ("y", False)]


def test_lengths_and_variances_are_in_the_files_unit(run, shaped, tmp_path):
    text = SHAPED.replace("unit: nm", "unit: um").replace("60", "0.06").replace("30", "0.03")
    (tmp_path / "um.yaml").write_text(text)
    lines = (tmp_path / "data.csv").read_text().splitlines()[:-2]
    scaled = [lines[0]]
    for line in lines[1:]:
        *rest, dx, dy = line.split(",")
        scaled.append(",".join([*rest, f"{float(dx) / 1000:.6f}", f"{float(dy) / 1000:.6f}"]))
    (tmp_path / "um.csv").write_text("\n".join(scaled) + "\n")
    (nm,), (um,) = (document(run, *pair)["readings"] for pair in (shaped, ("um.yaml", "um.csv")))
    assert um["x"]["mean"] * 1000 == pytest.approx(nm["x"]["mean"])
    assert um["wafer"]["shift_x"] * 1000 == pytest.approx(nm["wafer"]["shift_x"])
    assert um["wafer"]["rotation"] == pytest.approx(nm["wafer"]["rotation"])  # urad, whatever the unit
    assert um["variance"]["field"] * 1e6 == pytest.approx(nm["variance"]["field"])


def test_table_fits_80_columns_and_tells_what_is_wrong_with_the_data(run, shaped, tmp_path):
    result = run("measured", *shaped)
    assert result.exit_code == 0
    assert max(map(len, result.stdout.splitlines())) <= 80
    assert "1 cannot be read, 1 left out as outliers" in result.stdout.replace("\n  ", " ")
    for title in (
        "Overlay", "Linear fit over the wafer", "Linear fit over the field", "Variance by level",
        "What it says about alignment", "Outliers",
    ):  # fmt: skip
        assert title in result.stdout.splitlines()
    n = (tmp_path / "data.csv").read_text().count("\n")
    assert f"data.csv:{n - 1}:" in result.stderr
    assert "dx is not a number: 'oops' [FP703]" in result.stderr
    assert f"data.csv:{n}: B on A, dx 8000.0, dy 0.0, " in result.stdout


def test_markdown(run, shaped):
    text = run("measured", *shaped, "--format", "markdown").stdout
    assert text.startswith("# Estuary two masks, revision A: measured overlay\n")
    assert "| reading | axis | rows | mean | 3 sigma |" in text


def test_outliers_count_when_kept(run, shaped):
    kept = document(run, *shaped, "--keep-outliers")
    assert kept["outliers"] == 0
    assert (
        kept["readings"][0]["x"]["three_sigma"]
        > 2 * document(run, *shaped)["readings"][0]["x"]["three_sigma"]
    )


def test_the_other_sign_turns_every_mean(run, shaped):
    one, other = (
        document(run, *shaped, "--sign", sign)["readings"][0]
        for sign in ("mask-minus-reference", "reference-minus-mask")
    )
    assert other["x"]["mean"] == pytest.approx(-one["x"]["mean"])
    assert other["wafer"]["rotation"] == pytest.approx(-one["wafer"]["rotation"])
    assert other["x"]["three_sigma"] == pytest.approx(one["x"]["three_sigma"])


def test_other_headings(run, shaped, tmp_path):
    text = (tmp_path / "data.csv").read_text().replace("mask,", "LAYER,", 1).replace(",dx,", ",OVL_X,", 1)
    (tmp_path / "other.csv").write_text(text)
    refused = run("measured", "two.yaml", "other.csv")
    assert refused.exit_code == 2
    assert "other.csv:1:1: no column mask [FP702]" in refused.stderr
    found = document(run, "two.yaml", "other.csv", "--columns", "mask=LAYER,dx=OVL_X")
    assert found["readings"] == document(run, *shaped)["readings"]


def test_measured_alignments_are_written_with_their_origin(run, shaped, tmp_path):
    result = run("measured", *shaped, "-o", "new.yaml")
    assert "wrote new.yaml: 2 measured alignments" in result.stderr
    text = (tmp_path / "new.yaml").read_text()
    assert "# measured: alignment to A along x and y from data.csv, " in text
    assert "}   # reads A\n" in text
    assert run("check", "new.yaml").exit_code == 0
    (found,) = document(run, "new.yaml", "data.csv")["readings"]
    assert found["x"]["planned"]["three_sigma"] == pytest.approx(found["x"]["three_sigma"], rel=5e-3)


def test_a_page_of_its_own_and_a_section_of_the_report(run, shaped, tmp_path):
    assert run("measured", *shaped, "-o", "page.html").exit_code == 0
    assert run("report", "two.yaml", "--measured", "data.csv", "-o", "report.html").exit_code == 0
    for name in ("page.html", "report.html"):
        page = (tmp_path / name).read_text()
        assert '<h2 id="measured-h">Measured overlay</h2>' in page
        assert page.count('class="vmap"') == 4
        assert page.count('class="pbar"') == 2
    assert "<script>" not in (tmp_path / "page.html").read_text()
    assert 'href="#measured"' in (tmp_path / "report.html").read_text()


def test_text_of_the_data_is_escaped_in_the_page(run, shaped, tmp_path):
    text = (tmp_path / "data.csv").read_text().replace("B,A,", "<b>B</b>,A,")
    (tmp_path / "evil.csv").write_text(text)
    assert (
        "the flow has no layer called '<b>B</b>'"
        in run("measured", "two.yaml", "evil.csv", "-o", "e.html").stderr
    )
    page = (tmp_path / "e.html").read_text()
    assert "<b>B</b>" not in page
    assert "&lt;b&gt;B&lt;/b&gt;" in page


def test_a_flow_without_wafer_and_field_still_has_spread(run, flow):
    assert run("measured", flow, "--make", "d.csv", "--lots", "2", "--wafers", "3").exit_code == 0
    found = document(run, flow, "d.csv")
    reading = found["readings"][0]
    assert (reading["n"], reading["wafer"]["scale_x"], reading["field"]["rotation"]) == (6, None, None)
    assert reading["x"]["three_sigma"] > 0
    assert "–" in run("measured", flow, "d.csv").stdout


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["two.yaml"], "no measured data are named [FP602]"),
        (["two.yaml", "none.csv"], "none.csv:1:1: cannot read the data: No such file or directory [FP701]"),
        (["two.yaml", "data.csv", "--columns", "foo"], "'foo' in --columns is not COLUMN=HEADING [FP602]"),
        (["two.yaml", "data.csv", "-o", "two.yaml"], "'two.yaml' is the flow file itself [FP501]"),
        (["two.yaml", "data.csv", "-o", "data.csv"], "'data.csv' is the measured data [FP602]"),
        (["two.yaml", "data.csv", "-o", "no/new.yaml"], "cannot write 'no/new.yaml'"),
        (["two.yaml", "data.csv", "--make", "x.csv"], "--make writes data and reads none [FP602]"),
        (["two.yaml", "two.yaml"], "no column mask [FP702]"),
    ],
)
def test_bad_questions_get_an_answer_and_status_2(run, shaped, arguments, message):
    result = run("measured", *arguments)
    assert result.exit_code == 2
    assert message in result.stderr
    assert "Traceback" not in result.stderr
    assert result.stdout == ""


def test_data_without_one_good_row_are_refused(run, shaped, tmp_path):
    head = (tmp_path / "data.csv").read_text().splitlines()[0]
    for rows, count in (("", 0), ("x\ny\n", 2)):
        (tmp_path / "bad.csv").write_text(f"{head}\n{rows}")
        result = run("measured", "two.yaml", "bad.csv")
        assert result.exit_code == 2
        assert "the file has no row that can be read [FP703]" in result.stderr
        assert result.stderr.count("1 fields where the headings are 10") == count


def test_a_variant_is_not_written(run, tmp_path, shaped):
    (tmp_path / "v.yaml").write_text(SHAPED + "variants:\n  - {name: other, masks: {B: {title: b}}}\n")
    result = run("measured", "v.yaml", "data.csv", "--variant", "other", "-o", "new.yaml")
    assert result.exit_code == 2
    assert "-o writes the file's own plan with measured sizes, not a variant's" in result.stderr


def test_nothing_to_make_from_a_flow_in_which_nobody_reads(run, tmp_path):
    (tmp_path / "one.yaml").write_text(SHAPED.split("  - {id: B", 1)[0])
    result = run("measured", "one.yaml", "--make", "d.csv")
    assert result.exit_code == 2
    assert "no mask of the flow reads another" in result.stderr

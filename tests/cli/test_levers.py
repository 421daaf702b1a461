"""``flowplan levers`` says what each quoted size is worth."""

import json

import pytest

LEVER = [
    "path", "axis", "value", "gain_if_halved", "gain_if_removed", "derivative", "dominates",
    "largest_passing", "unlimited", "unit",
]  # fmt: skip


def test_table_names_each_size_and_what_it_brings(run, flow):
    result = run("levers", flow)
    assert result.exit_code == 0
    assert result.stdout.splitlines()[:7] == [
        "Estuary four masks, revision A",
        "lengths in nm, mixed basis, 3 sigma; worst margin -1.962 nm, 1 fail",
        "",
        "    value  halved  removed  mends  per unit  leads  at most",
        "tools.stepper.alignment",
        "       30   +25.7    +47.0      1     -1.73      3    28.86",
        "",
    ]
    assert "1 more sizes are worth nothing by themselves (--all shows them)" in result.stdout


def test_figure_rounded_for_the_eye_still_passes(run, flow, tmp_path):
    at_most = run("levers", flow).stdout.splitlines()[5].split()[-1]
    text = (tmp_path / flow).read_text().replace("alignment: 30", f"alignment: {at_most}", 1)
    (tmp_path / "less.yaml").write_text(text)
    assert run("margins", "less.yaml", "--strict").exit_code == 0


def test_json_keys(run, flow):
    document = json.loads(run("levers", flow, "--format", "json").stdout)
    assert list(document) == ["worst", "failing", "levers"]
    assert document["failing"] == 1
    first, second = document["levers"]
    assert list(first) == LEVER
    assert list(first["gain_if_halved"]) == ["worst", "failing"]
    assert first["path"] == "tools.stepper.alignment"
    assert first["largest_passing"] == pytest.approx(50 / 3**0.5, rel=1e-11)
    assert (first["unlimited"], first["axis"], first["unit"]) == (False, None, "nm")
    # A pair fails that the coarse alignment has no part in.
    assert (second["largest_passing"], second["unlimited"]) == (None, False)


def test_size_without_limit_is_told_from_one_that_cannot_help(run, sound_flow):
    document = json.loads(run("levers", sound_flow, "--format", "json").stdout)
    coarse = next(x for x in document["levers"] if x["path"] == "tools.stepper.wafer_alignment")
    assert (coarse["largest_passing"], coarse["unlimited"]) == (None, True)
    assert "any" in run("levers", sound_flow, "--all").stdout


def test_lengths_are_in_the_unit_of_the_file(run, flow, tmp_path):
    text = (tmp_path / flow).read_text().replace("unit: nm", "unit: um")
    (tmp_path / "um.yaml").write_text(text)
    document = json.loads(run("levers", "um.yaml", "--format", "json").stdout)
    assert document["levers"][0]["value"] == 30
    assert document["levers"][0]["derivative"] == pytest.approx(-(3**0.5))


def test_angle_is_told_in_microradians_and_its_slope_in_file_units(run, tmp_path):
    text = (
        "flow: Estuary\nunit: um\nfield: {x: 20 mm, y: 20 mm}\ntools: {s: {alignment: 0}}\nmasks:\n"
        "  - {id: A, tool: s, aligns_to: wafer}\n"
        "  - {id: B, tool: s, aligns_to: A, terms: {turn: {bound: 0.001 mrad, shape: rotation}}}\n"
        "pairs: [{rule: overlay, between: [A, B], limit: 0.02, axes: x}]\n"
    )
    (tmp_path / "turn.yaml").write_text(text)
    document = json.loads(run("levers", "turn.yaml", "--format", "json", "--size", "masks.B").stdout)
    (turn,) = document["levers"]
    assert (turn["unit"], turn["value"]) == ("urad", 1)
    assert turn["derivative"] == pytest.approx(-0.01)  # 10 nm at the corner
    assert turn["largest_passing"] == pytest.approx(2)


def test_markdown(run, flow):
    lines = run("levers", flow, "--format", "markdown").stdout.splitlines()
    assert lines[0] == "worst margin -1.962 nm, 1 fail"
    assert lines[2].startswith("| size | axis | value | halved | removed |")
    assert lines[4].startswith("| tools.stepper.alignment |  | 30 | +25.7 | +47.0 | 1 |")


def test_unknown_size_is_refused_with_the_nearest(run, flow):
    result = run("levers", flow, "--size", "tools.stepper.alinment")
    assert result.exit_code == 2
    assert "the flow quotes no size at 'tools.stepper.alinment' [FP602]" in result.stderr
    assert "did you mean 'tools.stepper.alignment'?" in result.stderr


def test_nothing_judged(run, tmp_path):
    text = "flow: Estuary\ntools: {s: {alignment: 3}}\nmasks: [{id: A, tool: s, aligns_to: wafer}]\n"
    (tmp_path / "bare.yaml").write_text(text)
    result = run("levers", "bare.yaml")
    assert result.exit_code == 0
    assert "nothing is judged" in result.stdout


def test_help_shows_an_example(run):
    assert "Example: flowplan levers" in run("levers", "--help").stdout

"""The circle closes: data drawn from a flow's own sources, fitted, give the sources back."""

from pathlib import Path

import numpy as np
import pytest

from flowplan.engine.analysis import Engine
from flowplan.engine.measured.synthetic import readings_of, synthetic
from flowplan.files.alignments import write_alignments
from flowplan.files.measurementsout import write_measurements
from flowplan.files.reader import parse
from flowplan.report.measuring import Asked, take_measurements

FLOW = """\
flow: Estuary circle
unit: nm
wafer: {diameter: 150 mm, edge_exclusion: 5 mm}
field: {x: 20 mm, y: 20 mm}
tools:
  t:
    alignment: {random: {x: 60, y: 90}}
    terms:
      field error: {random: 30}
      turned: {offset: 0.5 urad, shape: rotation, over: wafer}
masks:
  - {id: A, tool: t, aligns_to: wafer}   # the first
  - id: B
    tool: t
    aligns_to: A   # reads A
    terms:
      drift: {random: 45, varies: lot}
      stretch: {offset: 2 ppm, shape: magnification, enters: pattern}
      sheared: {offset: 0.8 urad, shape: skew, over: wafer}
      known: {offset: {x: 12, y: -7}}
  - {id: C, tool: t, aligns_to: {x: A, y: B}}
pairs:
  - {rule: overlay, between: [A, B]}
"""


def made(tmp_path, text=FLOW, lots=30, wafers=6, seed=7, name="data.csv"):
    """Return a flow and the file of its synthetic data."""
    flow = parse(text).flow
    file = tmp_path / name
    write_measurements(str(file), synthetic(Engine.of(flow), seed, lots, wafers), flow.unit)
    return flow, str(file)


def reading(taken, mask, reference):
    (found,) = [r for r in taken.measured.readings if (r.mask, r.reference) == (mask, reference)]
    return found


def test_fit_and_split_give_the_sources_back(tmp_path):
    flow, file = made(tmp_path)
    taken = take_measurements(flow, file)
    found = reading(taken, "B", "A")
    # B takes over where A lies, its turn with it, and is printed with its own offsets on top of that.
    assert found.fit.field["magnification"] == pytest.approx(
        2, abs=4 * found.fit.field_errors["magnification"]
    )
    assert found.fit.wafer["skew"] == pytest.approx(0.8, abs=4 * found.fit.wafer_errors["skew"])
    assert found.fit.wafer["rotation"] == pytest.approx(0.5, abs=4 * found.fit.wafer_errors["rotation"])
    for axis, shift in (("x", 12), ("y", -7)):
        figures = found.axes[axis]
        assert figures.mean == pytest.approx(shift, abs=4 * figures.mean_error)
    # Standard error of a variance from n draws: sqrt(2 / n) of it.
    lots, wafers, fields = 30, 180, found.tally.n_fields
    split = found.axes["x"].split
    assert split.lot == pytest.approx(15**2, abs=4 * 15**2 * np.sqrt(2 / lots) * 1.5)
    assert split.wafer == pytest.approx(20**2, abs=4 * 20**2 * np.sqrt(2 / wafers) * 1.2)
    assert split.field == pytest.approx(10**2, abs=4 * 10**2 * np.sqrt(2 / fields))
    assert split.site == pytest.approx(0, abs=1e-3)  # dx is written to 0.001 nm
    assert found.axes["y"].split.wafer == pytest.approx(30**2, abs=4 * 30**2 * np.sqrt(2 / wafers) * 1.2)
    assert found.axes["x"].plan.three_sigma == pytest.approx(found.axes["x"].three_sigma, rel=0.2)


def test_the_written_flow_plans_what_was_measured(tmp_path):
    flow, file = made(tmp_path, lots=4, wafers=3)
    taken = take_measurements(flow, file)
    sizes = taken.sizes
    origins = sizes.origins(taken.measured, "data.csv")
    text = write_alignments(FLOW, flow, sizes.choices(), origins)
    again = take_measurements(parse(text).flow, file)
    for mask, reference, axes in (("B", "A", "xy"), ("C", "A", "x"), ("C", "B", "y")):
        for axis in axes:
            figures = reading(again, mask, reference).axes[axis]
            assert figures.plan.three_sigma == pytest.approx(figures.three_sigma, rel=5e-3)
    assert "    aligns_to: {mask: A, alignment: {random: {x: " in text
    assert "   # reads A\n" in text
    assert "  - {id: A, tool: t, aligns_to: wafer}   # the first\n" in text
    comments = [line for line in text.splitlines() if "# measured:" in line]
    assert len(comments) == 2
    assert "alignment to A along x and y from data.csv, " in comments[0]
    assert " rows on 12 wafers of 4 lots, overlay 3 sigma x " in comments[0]
    # Writing once more puts no second comment above the first.
    flow_again = parse(text).flow
    twice = write_alignments(text, flow_again, again.sizes.choices(), origins)
    assert twice.count("# measured:") == 2


def test_readings_without_a_single_reference_say_nothing_and_why(tmp_path):
    flow, file = made(tmp_path, lots=2, wafers=2)
    silent = take_measurements(flow, file).sizes.silent
    assert silent == ("C on A, y: C does not read A", "C on B, x: C does not read B")


def test_terms_larger_than_what_was_measured_leave_no_alignment(tmp_path):
    _, file = made(tmp_path, lots=2, wafers=2)
    louder = parse(FLOW.replace("field error: {random: 30}", "field error: {random: 900}")).flow
    found = take_measurements(louder, file).sizes.found
    assert {(one.random, one.error, one.exceeded) for one in found} == {(0.0, None, True)}
    assert take_measurements(louder, file).sizes.choices() == {}


def test_the_error_of_an_alignment_is_what_other_seeds_scatter_by(tmp_path):
    found = []
    for seed in range(25):
        flow, file = made(
            tmp_path, FLOW.replace("drift: {random: 45", "drift: {random: 1"), lots=1, wafers=12, seed=seed
        )
        found.append(
            next(f for f in take_measurements(flow, file).sizes.found if (f.mask, f.axis) == ("B", "y"))
        )
    scatter = np.std([f.random for f in found], ddof=1)
    # 25 draws tell a standard deviation to 14 percent; three times that are allowed.
    assert np.mean([f.error for f in found]) == pytest.approx(scatter, rel=0.45)
    assert np.mean([f.random for f in found]) == pytest.approx(90, abs=3 * scatter / 5)


def test_a_mask_on_the_back_gets_its_offset_in_its_own_sense(tmp_path):
    text = (
        FLOW.replace("drift: {random: 45", "drift: {random: 1")
        .replace("id: B\n", "id: B\n    side: back\n")
        .replace(
            "    aligns_to: A   # reads A",
            "    aligns_to: {mask: A, alignment: {random: 24, offset: {x: 40, y: 25}}}",
        )
    )
    flow, file = made(tmp_path, text, lots=4, wafers=4)
    found = {(f.mask, f.axis): f for f in take_measurements(flow, file).sizes.found}
    choices = take_measurements(flow, file).sizes.choices()
    assert found["B", "x"].offset == pytest.approx(40, abs=8)  # four standard errors of 16 wafers
    again = take_measurements(parse(write_alignments(text, flow, choices, {})).flow, file)
    for axis in "xy":
        figures = reading(again, "B", "A").axes[axis]
        assert figures.plan.offset == pytest.approx(figures.mean, abs=0.5)


def test_the_same_seed_gives_the_same_rows_and_another_others(tmp_path):
    files = [
        made(tmp_path, lots=1, wafers=1, seed=seed, name=f"{i}.csv")[1] for i, seed in enumerate((1, 1, 2))
    ]
    texts = [Path(file).read_text() for file in files]
    assert texts[0] == texts[1] != texts[2]


def test_parquet_closes_the_circle_too(tmp_path):
    flow, file = made(tmp_path, lots=2, wafers=2, name="data.parquet")
    _, csv = made(tmp_path, lots=2, wafers=2)
    a, b = (take_measurements(flow, f).measured.readings[0].axes["x"] for f in (file, csv))
    assert a == b


def test_a_bound_stands_still_and_an_outlier_does_not_count(tmp_path):
    text = FLOW.replace("drift: {random: 45, varies: lot}", "drift: {bound: 45}").replace(
        "alignment: {random: {x: 60, y: 90}}", "alignment: 0.003"
    )
    flow, file = made(tmp_path, text, lots=2, wafers=2)
    figures = reading(take_measurements(flow, file), "B", "A").axes["x"]
    assert abs(abs(figures.mean - 12) - 45) < 4
    # About 21 fields a wafer of standard deviation 10: the lots' own scatter is 100 / 42, here times six.
    assert figures.split.lot == pytest.approx(0, abs=15)
    assert figures.plan.bound == pytest.approx(45)
    with Path(file).open("a") as stream:
        stream.write("B,A,L1,1,0,0,0,0,9000,0\n")
    for limit, n_out in ((6.0, 1), (None, 0)):
        taken = take_measurements(flow, file, Asked(limit=limit))
        assert taken.measured.n_outliers == n_out
        sigma = reading(taken, "B", "A").axes["x"].sigma
        assert (sigma > 100) == (limit is None)


def test_readings_are_each_mask_on_all_that_it_reads():
    assert readings_of(parse(FLOW).flow) == (("B", "A"), ("C", "A"), ("C", "B"))

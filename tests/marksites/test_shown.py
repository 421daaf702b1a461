"""``flowplan chain`` and the report tell how a fit's error grows, and what other marks would do."""

import json
import math
import re

import numpy as np
import pytest
from typer.testing import CliRunner

from flowplan.cli.main import app
from flowplan.engine.markoutlook import TRIED, growth, outlook
from flowplan.engine.marksites import deviations
from flowplan.files.reader import parse
from flowplan.model.marksites import MarkSites
from flowplan.report.viewmarks import ticks

ON_WAFER = "{per_mark: 30, model: rigid, sites: {ring: {count: 9, radius: 40 mm}}}"
IN_FIELD = """\
{per_mark: {x: 8, y: 6}, over: field, model: rigid, sites: [{x: 6 mm, y: 5 mm}, {x: -6 mm, y: -5 mm}]}"""
#: A ring of nine marks at 40 mm, each read to 30 nm: shift 10 nm, rotation 0.25 urad.
FLOW = f"""\
flow: Estuary
wafer: {{diameter: 130 mm, edge_exclusion: 5 mm}}
field: {{x: 13 mm, y: 11 mm}}
tools:
  t: {{alignment: {ON_WAFER}}}
masks:
  - {{id: A, tool: t, aligns_to: wafer}}
  - {{id: B, tool: t, aligns_to: A}}
  - id: C
    tool: t
    aligns_to:
      mask: A
      alignment:
        {IN_FIELD}
  - {{id: D, tool: t, aligns_to: {{mask: B, alignment: 5}}}}
pairs:
  - {{rule: overlay, between: [A, B], limit: 90}}
"""


@pytest.fixture
def flow():
    return parse(FLOW, "f.yaml").flow


@pytest.fixture
def run(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "f.yaml").write_text(FLOW)
    return lambda *arguments: CliRunner().invoke(app, arguments, prog_name="flowplan")


# -- the figures -----------------------------------------------------------------------------------


def test_on_a_ring_the_error_grows_by_the_rotation(flow):
    """By hand: sqrt(shift^2 + (rotation r)^2), 10 nm and 0.25 nm/mm quoted at 3 sigma, 60 mm of radius."""
    found = growth(flow, flow.tools["t"].alignment)
    assert found.distances.tolist() == [0, 30, 60]
    expected = [10 / 3, math.hypot(10, 7.5) / 3, math.hypot(10, 15) / 3]
    assert found.sigma["x"].tolist() == pytest.approx(expected)
    assert found.sigma["y"].tolist() == pytest.approx(expected)


def test_in_a_field_it_grows_towards_the_corners(flow):
    """By hand: two marks 2 (6, 5) mm apart; the rotation moves x by y and y by x."""
    sites = flow.masks[2].aligns_to.x[0].alignment
    found = growth(flow, sites)
    assert found.distances[-1] == pytest.approx(math.hypot(6.5, 5.5))
    rotation = math.sqrt(((5 * 8) ** 2 + (6 * 6) ** 2) * 2) / (2 * (6**2 + 5**2))
    assert found.sigma["x"][-1] * 3 == pytest.approx(math.hypot(8 / math.sqrt(2), rotation * 5.5))
    assert found.sigma["y"][-1] * 3 == pytest.approx(math.hypot(6 / math.sqrt(2), rotation * 6.5))


def test_the_worst_direction_counts(flow):
    """Marks on the x axis alone: the linear part of y is loose along y; nothing nearer is worse."""
    places = [{"x": f"{x} mm", "y": f"{y} mm"} for x, y in [(-50, 0), (50, 0), (0, 4), (0, -4)]]
    sites = MarkSites.model_validate({"per_mark": 30, "sites": places, "model": "linear"})
    worst = growth(flow, sites).sigma["y"][-1]
    along_y = deviations(sites, "nm", 3.0, np.array([[0.0, 60.0]]))["y"][0]
    assert worst == pytest.approx(along_y)


def test_other_numbers_of_marks_stand_on_a_ring_as_wide_as_the_planned_marks(flow):
    """By hand: n marks instead of 9 make every error sqrt(9 / n) times as large."""
    found = outlook(flow, flow.tools["t"].alignment)
    assert found.radius == pytest.approx(40)
    assert [count for count, _ in found.tried] == list(TRIED)
    for count, grown in found.tried:
        assert grown.sigma["x"] == pytest.approx(math.sqrt(9 / count) * found.planned.sigma["x"])


def test_numbers_too_few_for_the_model_are_left_out(flow):
    linear = flow.tools["t"].alignment.model_copy(update={"model": "linear"})
    assert [count for count, _ in outlook(flow, linear).tried] == [n for n in TRIED if n >= 3]


def test_a_ring_tried_in_a_field_fits_the_field(flow):
    assert outlook(flow, flow.masks[2].aligns_to.x[0].alignment).radius == 5.5


# -- chain -----------------------------------------------------------------------------------------


def test_chain_shows_the_growth_of_each_alignment_on_it(run):
    result = run("chain", "f.yaml", "B", "C", "--axis", "x")
    assert result.exit_code == 0
    lines = [line.rstrip() for line in result.stdout.splitlines()]
    at = lines.index("Alignment from mark sites: B reads A")
    shown = [line.split() for line in lines[at + 1 : at + 16]]
    assert ["marks", "centre", "30", "mm", "edge", "60", "mm"] in shown
    assert ["9,", "as", "planned", "10.00", "12.50", "18.03"] in shown
    assert "about the centre: shift x ±10.00, shift y ±10.00, rotation ±0.25 urad" in lines[at + 3]
    assert ["4", "15.00", "18.75", "27.04"] in shown
    assert "Alignment from mark sites: C reads A" in lines


def test_chain_is_silent_where_nothing_is_fitted(run):
    assert "mark sites" not in run("chain", "f.yaml", "B", "D", "--axis", "x").stdout


def test_chain_as_json(run):
    (axis,) = json.loads(run("chain", "f.yaml", "A", "B", "--axis", "y", "--format", "json").stdout)["axes"]
    (found,) = axis["mark_sites"]
    tried = found["ring"].pop("tried")
    assert found == {
        "reads": [{"child": "B", "reference": "A"}],
        "model": "rigid",
        "over": "wafer",
        "marks": 9,
        "fitted": {"shift_x": 10, "shift_y": 10, "rotation": 0.25},
        "distances": [0, 30, 60],
        "random": [10, 12.5, pytest.approx(math.hypot(10, 15))],
        "ring": {"radius": 40},
    }
    assert {"marks": 4, "random": [15, 18.75, pytest.approx(1.5 * math.hypot(10, 15))]} in tried


# -- report ----------------------------------------------------------------------------------------


def test_the_report_draws_each_alignment_once(run, tmp_path):
    assert run("report", "f.yaml", "-o", "r.html").exit_code == 0
    page = (tmp_path / "r.html").read_text(encoding="utf-8")
    assert page.count('<svg class="grow"') == 2
    assert page.count('<a href="#marksites">') == 1
    assert "Rigid from 9 marks over the wafer" in page
    assert "Rigid from 2 marks over the field" in page
    assert re.search(r"the fit gives shift x ±10\.\d*, shift y ±10\.\d*, rotation ±0\.25 urad\.", page)


def test_a_report_without_marks_has_no_such_section(run, tmp_path):
    plain = FLOW.replace(ON_WAFER, "9").replace(IN_FIELD, "7")
    (tmp_path / "g.yaml").write_text(plain)
    assert run("report", "g.yaml", "-o", "g.html").exit_code == 0
    assert "marksites" not in (tmp_path / "g.html").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("top", "expected"),
    [
        (60, [0, 20, 40, 60]),
        (1, [0, 0.2, 0.4, 0.6, 0.8, 1]),
        (12.2, [0, 2.5, 5, 7.5, 10]),
        (7e-3, [0, 2e-3, 4e-3, 6e-3]),
    ],
)
def test_ticks_are_round(top, expected):
    assert ticks(top) == pytest.approx(expected)

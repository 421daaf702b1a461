"""Entries as plain records: units, nulls and rounding."""

import math

import pytest

from flowplan.engine.analysis import Result
from flowplan.report.records import entry_record, finite, in_unit, margins_document, point_record
from tests.support.flows import bare_flow, entry, margins_of, mask, overlay_pair


@pytest.mark.parametrize(
    ("nm", "unit", "expected"),
    [
        (120.0, "um", 0.12),
        (25.4e6, "in", 1.0),
        (0.1 + 0.2, "nm", 0.3),
        (None, "nm", None),
        (math.inf, "um", None),
    ],
)
def test_in_unit(nm, unit, expected):
    assert in_unit(nm, unit) == expected


@pytest.mark.parametrize(
    ("value", "expected"), [(1 / 3, 0.333333333333), (-math.inf, None), (math.nan, None), (None, None)]
)
def test_finite(value, expected):
    assert finite(value) == expected


def result(**terms):
    masks = [mask("A"), mask("B", "A", terms=terms)]
    pairs = [overlay_pair("A", "B", limit=9), overlay_pair("B", "A", axes="y")]
    geometry = {"wafer": {"diameter": "60 mm"}, "field": {"x": "10 mm", "y": "10 mm"}}
    return margins_of(bare_flow(masks, pairs, unit="um", **geometry))


def test_infinite_cpk_is_null():
    record = entry_record(entry(result(t={"bound": 2}), "A-B"), "um")
    assert (record["cpk"], record["fail_ppm"]) == (None, 0.0)


def test_what_is_not_judged_is_null():
    record = entry_record(entry(result(t=2), "B-A", "y"), "um")
    assert [record[k] for k in ("drawn", "nominal", "margin", "cpk", "fail_ppm", "point")] == [None] * 6
    assert record["verdict"] == "unjudged"


def test_a_source_with_a_shape_keeps_its_own_unit():
    """1 urad over 30 mm: 0.03 um per urad; the size stays in urad, whatever the file's unit."""
    found = entry(result(turn={"random": "2 urad", "shape": "rotation", "over": "wafer"}), "A-B")
    record = entry_record(found, "um")
    (source,) = record["sources"]
    lever = abs(found.point.Y + found.point.y)
    assert (source["size"], source["shape"], source["kind"]) == (2, "rotation", "random")
    assert abs(source["coefficient"]) == pytest.approx(lever / 1000)
    assert record["random"] == pytest.approx(2 * lever / 1000)
    assert record["point"] == point_record(found.point)


def test_a_result_of_some_entries_counts_those():
    whole = result(t=2)
    document = margins_document(Result(whole.engine, whole.entries[:1]))
    assert document["counts"] == {"pass": 1, "tight": 0, "fail": 0, "unjudged": 0}
    assert len(document["margins"]) == 1
    assert (document["revision"], document["variant"]) == (None, None)

"""What goes out as JSON is whole and valid, and a flow written out means the same when read again."""

import json
import math

import jsonschema
import pytest
from hypothesis import given

from flowplan.api import Analysis
from flowplan.engine.analysis import analyse
from flowplan.model.build import build
from flowplan.model.schema import flow_schema
from flowplan.report.records import margins_document
from tests.support.byhand import FACTORS
from tests.support.flows import flow_of, margins_of
from tests.support.random_flows import flows

#: The keys that the README promises, in this order.
DOCUMENT_KEYS = ["flow", "revision", "unit", "basis", "confidence", "variant", "counts", "margins"]
ENTRY_KEYS = [
    "pair", "rule", "layers", "axis", "chain", "through", "drawn", "keep", "nominal", "offset", "bound",
    "random", "overlay", "need", "margin", "verdict", "cpk", "fail_ppm", "point", "chain_rss", "sources",
]  # fmt: skip
SOURCE_KEYS = ["name", "of", "kind", "shape", "coefficient", "size", "share"]
SCHEMA = jsonschema.Draft202012Validator(flow_schema())


@given(data=flows())
def test_the_document_is_strict_json_and_comes_back_the_same(data):
    document = margins_document(margins_of(data))
    assert json.loads(json.dumps(document, allow_nan=False)) == document


@given(data=flows())
def test_every_key_that_is_promised_and_no_other(data):
    document = margins_document(margins_of(data))
    assert list(document) == DOCUMENT_KEYS
    for entry in document["margins"]:
        assert list(entry) == ENTRY_KEYS
        assert all(list(row) == SOURCE_KEYS for row in entry["sources"])
    assert sum(document["counts"].values()) == len(document["margins"])


@given(data=flows())
def test_the_record_holds_the_entry_in_the_file_s_unit(data):
    result = margins_of(data)
    nm = FACTORS[data["unit"]]
    for entry, record in zip(result.entries, Analysis(result).to_records(), strict=True):
        assert record["random"] * nm == pytest.approx(entry.residual.random, rel=1e-11)
        assert record["overlay"]["offset"] * nm == pytest.approx(entry.overlay.offset, rel=1e-11)
        assert (record["margin"] is None) == (entry.margin is None)
        if entry.cpk is not None:
            assert (record["cpk"] is None) == math.isinf(entry.cpk)
            assert record["fail_ppm"] == pytest.approx(entry.fail_probability * 1e6, rel=1e-11)


@given(data=flows())
def test_coefficient_times_size_is_the_contribution(data):
    result = margins_of(data)
    nm = FACTORS[data["unit"]]
    for entry, record in zip(result.entries, Analysis(result).to_records(), strict=True):
        for row, source in zip(entry.sources, record["sources"], strict=True):
            contribution = source["coefficient"] * source["size"] * nm
            assert contribution == pytest.approx(row.contribution, rel=1e-10)


@given(data=flows())
def test_a_flow_written_out_means_the_same(data):
    """`model_dump` gives plain data that the model reads back into an equal flow."""
    flow = flow_of(data)
    plain = json.loads(json.dumps(flow.model_dump(mode="json", exclude_none=True), allow_nan=False))
    again, findings = build(plain)
    assert not findings
    assert again == flow
    assert margins_document(analyse(again)) == margins_document(analyse(flow))


@given(data=flows())
def test_the_published_schema_accepts_every_flow_that_the_model_accepts(data):
    assert not list(SCHEMA.iter_errors(data))

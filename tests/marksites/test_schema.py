"""The JSON Schema takes the forms of an alignment that the reader takes, and no others."""

import jsonschema
import pytest

from flowplan.model.build import build
from flowplan.model.schema import flow_schema
from tests.marksites.material import alignment, one_reading

RING = (4, 20.0)
ACCEPTED = [
    3,
    "3 nm",
    {"x": 3, "y": 4},
    {"random": 3, "uniform": 2},
    alignment(RING),
    alignment([(1.0, 2.0), (3.0, 4.0)], "linear", over="field"),
    alignment(RING, per_mark={"uniform": {"x": 3, "y": "4 nm"}}),
]
REFUSED = [
    {"per_mark": 3},
    alignment(RING, "affine"),
    alignment([]),
    alignment((0, 3.0)),
    alignment((2000, 3.0)),
    alignment(RING, over="lot"),
    alignment(RING, random=3),
    alignment(RING) | {"sites": [{"x": 3}]},
    alignment(RING) | {"sites": {"ring": {"count": 3, "radius": 4, "start": 5}}},
]


@pytest.fixture(scope="module")
def validator():
    return jsonschema.Draft202012Validator(flow_schema())


@pytest.mark.parametrize("given", ACCEPTED, ids=str)
def test_accepted_by_both(validator, given):
    data = one_reading(given)
    assert build(data)[0] is not None
    assert validator.is_valid(data)


@pytest.mark.parametrize("given", REFUSED, ids=str)
def test_refused_by_both(validator, given):
    data = one_reading(given)
    assert build(data)[0] is None
    assert not validator.is_valid(data)

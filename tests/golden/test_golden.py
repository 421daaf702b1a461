"""Every figure of every example flow against its golden file; see regenerate.py for how to renew them."""

import json
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

import flowplan

GOLDEN = Path(__file__).resolve().parent
FLOWS = GOLDEN.parents[1] / "flows"
NAMES = sorted(file.stem for file in FLOWS.glob("*.yaml"))
#: Room for the rounding of another processor's library, far below any digit that is shown.
RELATIVE = 1e-9


def differences(found: Any, wanted: Any, where: str = "") -> Iterator[str]:
    """Yield where two documents differ: numbers by more than RELATIVE, everything else at all."""
    if isinstance(wanted, dict) and isinstance(found, dict) and found.keys() == wanted.keys():
        for key in wanted:
            yield from differences(found[key], wanted[key], f"{where}.{key}")
    elif isinstance(wanted, list) and isinstance(found, list) and len(found) == len(wanted):
        for i, (a, b) in enumerate(zip(found, wanted, strict=True)):
            yield from differences(a, b, f"{where}[{i}]")
    elif not same(found, wanted):
        yield f"{where}: {found!r}, golden {wanted!r}"


def same(found: Any, wanted: Any) -> bool:
    numbers = (int, float)
    if isinstance(found, numbers) and isinstance(wanted, numbers) and not isinstance(found, bool):
        return math.isclose(found, wanted, rel_tol=RELATIVE)
    return type(found) is type(wanted) and found == wanted


@pytest.mark.parametrize("name", NAMES)
def test_flow_says_what_its_golden_file_says(name):
    found = flowplan.analyse(flowplan.load(FLOWS / f"{name}.yaml")).to_document()
    golden = json.loads((GOLDEN / f"{name}.json").read_text(encoding="utf-8"))
    assert list(differences(json.loads(json.dumps(found)), golden))[:10] == []


def test_every_golden_file_has_a_flow():
    assert sorted(file.stem for file in GOLDEN.glob("*.json")) == NAMES


@pytest.mark.parametrize(
    ("found", "wanted"),
    [
        ({"a": 1.0 + 2e-9}, {"a": 1.0}),
        ({"a": 1e-30}, {"a": 0.0}),
        ({"a": None}, {"a": 0.0}),
        ({"a": True}, {"a": 1}),
        ({"a": "pass"}, {"a": "tight"}),
        ({"a": [1, 2]}, {"a": [1]}),
        ({"a": 1, "b": 2}, {"a": 1}),
    ],
)
def test_the_comparison_sees_a_difference(found, wanted):
    assert list(differences(found, wanted))


def test_the_comparison_allows_rounding():
    assert not list(differences({"a": [1.0 + 1e-12, None, "x"]}, {"a": [1.0, None, "x"]}))

"""Whatever is read, the reader gives a flow or findings inside the file, and what it gives can be used."""

from datetime import timedelta

import pytest
from hypothesis import HealthCheck, event, example, given, settings
from hypothesis import strategies as st

from tests.fuzz.material import (
    STARTER,
    WHOLE,
    as_yaml,
    mutants,
    read_or_refuse,
    scalars,
    structures,
    work_out,
)

#: No time is measured here; one example that takes this long hangs.
HANGS = timedelta(seconds=20)


def fuzz(examples: int):
    return settings(
        max_examples=examples, deadline=HANGS, derandomize=True, database=None,
        suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large, HealthCheck.filter_too_much],
    )  # fmt: skip


def read_and_use(text):
    loaded = read_or_refuse(text)
    event("accepted" if loaded else "refused")
    if loaded:
        work_out(loaded)


def test_the_material_is_sound():
    for text in (as_yaml(WHOLE), STARTER):
        loaded = read_or_refuse(text)
        assert loaded is not None
        work_out(loaded)


@given(st.text())
@example("\x00")
@example("%YAML 9.9\n---\na: 1")
@example("\u2028a: [")
@fuzz(400)
def test_any_text(text):
    read_and_use(text)


@given(st.text(alphabet="{}[]:,-?&*!|>'\"%@`#~<=. \n\t\rab1", max_size=40))
@fuzz(400)
def test_text_of_the_signs_that_yaml_gives_a_meaning(text):
    read_and_use(text)
    read_and_use("flow: Estuary\nmasks: " + text)


@given(st.binary(max_size=200))
@example(b"\xef\xbb\xbf\xef\xbb")
@example(b"\xff\xfea\0")
@example(b"a: 1\r\n\xb5")
@fuzz(80)
def test_any_bytes(raw):
    read_and_use(raw)


@given(structures)
@fuzz(80)
def test_any_structure(data):
    read_and_use(as_yaml(data))


@given(st.dictionaries(st.sampled_from(sorted(WHOLE)), structures))
@fuzz(80)
def test_any_structure_under_the_keys_of_a_flow(data):
    read_and_use(as_yaml({**WHOLE, **data}))


@given(mutants())
@fuzz(150)
def test_a_flow_with_changes(data):
    read_and_use(as_yaml(data))


@given(mutants(1))
@fuzz(150)
def test_a_flow_with_one_change(data):
    read_and_use(as_yaml(data))


@pytest.mark.parametrize("key", ["flow", "title", "notes", "id", "tool", "name", "term", "source", "split"])
@given(st.text(max_size=12) | scalars)
@fuzz(20)
def test_any_name_in_every_place_that_takes_one(key, name):
    data = {**WHOLE, "masks": [dict(mask) for mask in WHOLE["masks"]], "pairs": [dict(WHOLE["pairs"][0])]}
    if key in ("flow", "title", "notes"):
        data[key] = name
    elif key == "name":
        data["pairs"][0]["name"] = name
    elif key == "term":
        data["masks"][0]["terms"] = {str(name): 3}
    elif key == "source":
        data["masks"][0]["terms"] = {"t": {"bound": 3, "source": name}}
    elif key == "split":
        data["split_layers"] = {str(name): ["VIA", "METAL"]}
        data["pairs"][0]["inner"], data["pairs"][0]["outer"] = str(name), "GATE"
    elif key == "tool":
        data["tools"] = {**WHOLE["tools"], str(name): {"alignment": 3}}
        data["masks"][0]["tool"] = name
    else:
        data["masks"][3]["id"] = name
        data["split_layers"], data["pairs"][0]["outer"] = {}, name
    read_and_use(as_yaml(data))


lines = STARTER.splitlines(keepends=True)


@given(st.lists(st.tuples(st.integers(0, len(lines) - 1), st.integers(0, len(lines) - 1)), max_size=3))
@fuzz(60)
def test_a_text_with_lines_moved_and_lost(moves):
    changed = list(lines)
    for origin, target in moves:
        if origin < len(changed):
            line = changed.pop(origin)
            if origin != target:
                changed.insert(target, line)
    read_and_use("".join(changed))


@given(
    st.lists(
        st.tuples(st.integers(0, len(STARTER) - 1), st.sampled_from(["", "\t", ":", "{", "'", "\x07", "  "])),
        min_size=1, max_size=3,
    )
)  # fmt: skip
@fuzz(80)
def test_a_text_with_signs_replaced(changes):
    text = STARTER
    for index, sign in changes:
        text = text[:index] + sign + text[index + 1 :]
    read_and_use(text)

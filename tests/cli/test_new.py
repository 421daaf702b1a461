"""``flowplan new`` writes a starter flow, ``flowplan schema`` what an editor needs for it."""

import json
from pathlib import Path

import jsonschema
import pytest

from flowplan.files.yamltext import read_yaml
from flowplan.model.schema import flow_schema


def test_the_starter_flow_passes_check_without_a_warning(run):
    result = run("new", "my.yaml")
    assert (result.exit_code, result.stdout) == (0, "")
    assert "next: flowplan check my.yaml" in result.stderr
    checked = run("check", "my.yaml", "--strict")
    assert (checked.exit_code, checked.stderr) == (0, "")
    assert ": sound\n" in checked.stdout


def test_the_starter_flow_shows_every_rule_and_a_self_aligned_feature(run):
    run("new", "my.yaml")
    entries = json.loads(run("margins", "my.yaml", "--format", "json").stdout)["margins"]
    assert {e["rule"] for e in entries} == {"enclosure", "extension", "spacing", "overlap", "overlay"}
    assert "(self-aligned)" in run("tree", "my.yaml").stdout


def test_its_first_line_leads_an_editor_to_the_schema_that_the_message_names(run):
    result = run("new", "my.yaml")
    first = Path("my.yaml").read_text().splitlines()[0]
    assert first == "# yaml-language-server: $schema=flow.schema.json"
    assert "flowplan schema -o flow.schema.json" in result.stderr


def test_the_schema_goes_beside_a_flow_in_another_folder(run):
    Path("flows").mkdir()
    result = run("new", "flows/my.yaml")
    assert "flowplan schema -o flows/flow.schema.json" in result.stderr


def test_an_existing_file_is_left_alone_unless_forced(run):
    Path("my.yaml").write_text("mine")
    result = run("new", "my.yaml")
    assert result.exit_code == 2
    assert result.stderr.startswith("flowplan: 'my.yaml' exists already [FP501]")
    assert Path("my.yaml").read_text() == "mine"
    assert run("new", "my.yaml", "--force").exit_code == 0
    assert run("check", "my.yaml").exit_code == 0


def test_without_a_name_it_is_called_flow_yaml(run):
    run("new")
    assert Path("flow.yaml").is_file()


def test_a_dash_prints_the_flow(run):
    run("new")
    assert run("new", "-").stdout == Path("flow.yaml").read_text()


def test_a_folder_that_does_not_exist_is_told(run):
    result = run("new", "nowhere/my.yaml")
    assert result.exit_code == 2
    assert "[FP501]" in result.stderr


def test_the_schema_is_printed_or_written(run):
    printed = run("schema").stdout
    assert run("schema", "-o", "s.json").exit_code == 0
    assert json.loads(printed) == json.loads(Path("s.json").read_text())
    assert printed.startswith('{\n  "$schema": "https://json-schema.org/draft/2020-12/schema"')


@pytest.fixture(scope="module")
def validator():
    schema = flow_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_the_schema_accepts_the_starter_flow(run, validator):
    run("new")
    data, _ = read_yaml(Path("flow.yaml").read_text(), "flow.yaml")
    assert [e.message for e in validator.iter_errors(data)] == []

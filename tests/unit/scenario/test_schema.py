"""The JSON Schema that editors use, and the scenarios that come with the program."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

import crowdsim
from crowdsim.scenario.reader import read_scenario
from crowdsim.scenario.schema import ScenarioFile, json_schema

SCENARIOS = sorted((Path(crowdsim.__file__).parents[1] / "scenarios").glob("*.toml"))


def types_of(schema: dict[str, Any]) -> set[str]:
    """The types that a value may have, through anyOf."""
    found = {schema["type"]} if "type" in schema else set()
    return found.union(*(types_of(s) for s in schema.get("anyOf", [])))


def references(node: Any) -> Iterator[str]:
    """Every $ref below a node."""
    if isinstance(node, dict):
        if "$ref" in node:
            yield node["$ref"]
        for value in node.values():
            yield from references(value)
    elif isinstance(node, list):
        for value in node:
            yield from references(value)


def test_it_is_plain_json_whose_references_lead_somewhere() -> None:
    schema = json_schema()
    assert json.loads(json.dumps(schema, allow_nan=False)) == schema
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    used = set(references(schema))
    assert used
    for reference in used:
        assert reference.removeprefix("#/$defs/") in schema["$defs"]


def test_it_has_every_table_and_refuses_unknown_keys() -> None:
    schema = json_schema()
    assert set(schema["properties"]) == set(ScenarioFile.model_fields)
    assert set(schema["required"]) == {"deck", "mode", "stream"}
    tables = [d for d in schema["$defs"].values() if d["type"] == "object"]
    assert len(tables) >= 10
    assert all(t["additionalProperties"] is False for t in [*tables, schema])


@pytest.mark.parametrize(
    ("table", "key"),
    [
        ("DeckTable", "length"), ("ModeTable", "frequency"), ("ModeTable", "damping"), ("ModeTable", "modal_mass"),
        ("Arrival", "per_hour"), ("Arrival", "density"), ("RunTable", "duration"), ("RunTable", "time_step"),
        ("StreamTable", "pace"), ("StreamTable", "weight"), ("StreamTable", "offset"), ("RandomPace", "sd"),
        ("CaseTable", "limit"), ("PointTable", "s"),
    ],
)  # fmt: skip
def test_a_quantity_may_be_a_number_or_a_string(table: str, key: str) -> None:
    assert {"number", "string"} <= types_of(json_schema()["$defs"][table]["properties"][key])


def test_bounds_stand_on_the_number_beside_the_unit_string() -> None:
    length = json_schema()["$defs"]["DeckTable"]["properties"]["length"]
    assert {"type": "number", "exclusiveMinimum": 0, "maximum": 5000} in length["anyOf"]
    assert {"type": "string"} in length["anyOf"]
    harmonics = json_schema()["$defs"]["Load"]["properties"]["harmonics"]
    assert {"type": "number", "minimum": 0, "maximum": 10} in harmonics["items"]["anyOf"]


def test_nothing_is_offered_that_toml_cannot_say() -> None:
    assert '"type": "null"' not in json.dumps(json_schema())


def test_a_count_may_not_be_a_string() -> None:
    assert types_of(json_schema()["$defs"]["RunTable"]["properties"]["realisations"]) == {"integer"}


def test_it_is_a_valid_json_schema_that_takes_the_clean_scenario(clean: str) -> None:
    validators = pytest.importorskip("jsonschema", reason="jsonschema is not installed")
    schema = json_schema()
    validators.Draft202012Validator.check_schema(schema)
    validator = validators.Draft202012Validator(schema)
    assert list(validator.iter_errors(tomllib.loads(clean))) == []
    with_units = clean.replace("48.0", '"48 m"').replace("0.005", '"0.5 %"').replace("mean = 1.87", 'mean = "112/min"')
    assert list(validator.iter_errors(tomllib.loads(with_units))) == []
    assert list(validator.iter_errors(tomllib.loads(clean.replace("length", "lenght")))) != []
    assert list(validator.iter_errors(tomllib.loads(clean.replace("48.0", "true")))) != []
    assert list(validator.iter_errors(tomllib.loads(clean.replace("48.0", "-48.0")))) != []


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda p: p.name)
def test_every_scenario_that_comes_with_the_program_is_read(path: Path) -> None:
    assert read_scenario(path).title != "untitled"


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda p: p.name)
def test_every_scenario_that_comes_with_the_program_fits_the_schema(path: Path) -> None:
    validators = pytest.importorskip("jsonschema", reason="jsonschema is not installed")
    validator = validators.Draft202012Validator(json_schema())
    assert list(validator.iter_errors(tomllib.loads(path.read_text(encoding="utf-8")))) == []

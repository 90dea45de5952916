from __future__ import annotations

import json
import tomllib
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from benchtool import circuits
from benchtool.designs import design_schema, schema, tables, vocabulary
from benchtool.model import design as records

HERE = Path(__file__).parent
VALIDATOR = Draft202012Validator(design_schema())

BY_SHAPE = [
    "unknown_schema_number",
    "schema_missing",
    "misspelt_key",
    "misspelt_table",
    "misspelt_part",
    "misspelt_key_in_inline_table",
    "key_in_wrong_table",
    "unknown_topology",
    "missing_topology",
    "part_of_another_topology",
    "missing_part",
    "key_of_another_topology",
    "wrong_type",
    "unknown_family",
    "schmitt_without_thresholds",
    "schmitt_without_one_threshold",
    "unknown_quantity",
    "quantities_empty",
    "unknown_derivation",
    "no_stage",
    "bad_decision",
]
"""What a structure can tell without reading values."""


def read(path: Path) -> object:
    return tomllib.loads(path.read_text(encoding="utf-8"))


def test_the_schema_is_a_schema_and_plain_json() -> None:
    Draft202012Validator.check_schema(design_schema())
    text = json.dumps(design_schema(), allow_nan=False)
    assert design_schema()["$id"] == "urn:benchtool:design:1"
    assert text.count("://") == 1, "only the dialect has an address"


@pytest.mark.lower_bounds
def test_the_schema_accepts_every_feature() -> None:
    assert list(VALIDATOR.iter_errors(read(HERE / "every_feature.toml"))) == []


@pytest.mark.parametrize("name", BY_SHAPE)
def test_the_schema_refuses_what_has_the_wrong_shape(name: str) -> None:
    assert list(VALIDATOR.iter_errors(read(HERE / "malformed" / f"{name}.toml")))


def test_every_key_is_described_with_an_example() -> None:
    for table in design_schema()["$defs"].values():
        for key, about in table.get("properties", {}).items():
            assert about.get("description"), key
            assert about.get("examples"), key


def test_examples_in_the_schema_are_values_that_load() -> None:
    for table in (tables.ResistorTable, tables.CapacitorTable, tables.IcTable, tables.LimitsTable):
        for name, info in table.model_fields.items():
            assert info.examples
            required = {"value": 1} if "value" in table.model_fields else {}
            assert table.model_validate(required | {name: info.examples[0]})
    whole = {
        key: info.examples[0]
        for key, info in schema.DesignTable.model_fields.items()
        if info.examples
    }
    assert schema.DesignTable.model_validate(
        {("schema" if k == "schema_" else k): v for k, v in whole.items()}
    )


def test_words_agree_with_circuits_and_records() -> None:
    for name, topology in circuits.TOPOLOGIES.items():
        assert vocabulary.TOPOLOGY_PARTS[name] == topology.parts
        takes_control = "control" in schema.known_keys(schema.STAGES[name])
        assert takes_control == topology.forced_by_control
        single = ("t_high",) if topology.run == "t_high" else ("delay",)
        assert topology.run is None or vocabulary.usual_quantities(name, 1) == single
    assert set(circuits.TOPOLOGIES) == set(vocabulary.TOPOLOGY_PARTS) == set(schema.STAGES)
    assert set(circuits.TOPOLOGIES) == set(records.TopologyName.__args__)
    assert set(circuits.FAMILIES) == set(tables.Family.__args__)
    assert {n: term.unit for n, term in vocabulary.IC_TERMS.items()} == dict(circuits.TERM_UNITS)


def test_words_agree_between_vocabulary_and_tables() -> None:
    assert tuple(vocabulary.QUANTITIES) == tables.QuantityName.__args__
    assert set(vocabulary.QUANTITIES) == set(schema.known_keys(tables.LimitsTable)) - {
        "derive",
        "quantities",
    }
    assert set(vocabulary.IC_TERMS) == set(schema.known_keys(tables.IcTable)) - {
        "family",
        "upper_threshold",
        "lower_threshold",
    }
    for name, parts in vocabulary.TOPOLOGY_PARTS.items():
        assert {"RA", "RB", "R", "C"} & set(schema.known_keys(schema.STAGES[name])) == set(parts)

"""The JSON Schema: it is one, it accepts what the reader accepts, and it refuses what a schema can."""

from __future__ import annotations

import datetime
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import tomli
from configurations import FRONT, changed

from swmodel.measures import MEASURES
from swmodel.settings import Experiment, read, schema
from swmodel.state import STARTS
from swmodel.steppers import STEPPERS

CONFIGS = sorted((Path(__file__).parent.parent / "configs").glob("**/*.toml"))


def as_json(node: Any) -> Any:
    """Return a TOML document as editors hand it to a schema: dates as text."""
    if isinstance(node, dict):
        return {key: as_json(value) for key, value in node.items()}
    if isinstance(node, list):
        return [as_json(value) for value in node]
    return node.isoformat() if isinstance(node, datetime.date | datetime.time) else node


@pytest.fixture(scope="module")
def validator() -> jsonschema.Draft202012Validator:
    return jsonschema.Draft202012Validator(schema())


def test_it_is_a_json_schema_of_2020_12() -> None:
    assert schema()["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    jsonschema.Draft202012Validator.check_schema(schema())


def test_it_accepts_a_whole_configuration(validator: jsonschema.Draft202012Validator) -> None:
    validator.validate(tomli.loads(FRONT))


def test_there_are_starting_points() -> None:
    assert CONFIGS


@pytest.mark.parametrize("path", CONFIGS, ids=lambda path: path.stem)
def test_every_starting_point_can_be_read_and_validates(path: Path, validator: jsonschema.Draft202012Validator) -> None:
    validator.validate(as_json(tomli.loads(path.read_text())))
    read_in = read(path)
    assert read_in.title
    assert read_in.question
    assert Experiment.from_json(read_in.as_json()) == read_in


@pytest.mark.parametrize(
    "edit",
    [
        ("precision =", "precison ="),
        ("[numerics]", "[sponge]\n[numerics]"),
        ("depth =", "deph ="),
        ('west = "wall"', 'west = "preiodic"'),
        ('kind = "formula"', 'kind = "formular"'),
        ('kind = "formula"\n', ""),
        ("[1024, 4]", "[1024, 4.5]"),
        ("[1024, 4]", "[true, 4]"),
        ("[1024, 4]", "[1024]"),
        ("[1024, 4]", "[1024, 0]"),
        ('"550 km"', '"km"'),
        ("linear = true", 'linear = "true"'),
        ('until = "3.6 day"\n', ""),
        ("[[start]]", "[start]"),
        ('value = "deformation_radius"', 'value = { theory = "deformation_radius", kk = 1 }'),
        ('depth = "100 m"', 'depth = { fil = "depth.nc" }'),
    ],
)
def test_it_refuses_what_a_schema_can_refuse(edit: tuple[str, str], validator: jsonschema.Draft202012Validator) -> None:
    assert not validator.is_valid(tomli.loads(changed(edit)))


def test_it_names_every_row_of_the_tables_and_describes_every_table() -> None:
    written = schema()
    text = str(written)
    for name in (*STARTS, *MEASURES, *STEPPERS):
        assert f"'{name}'" in text
    for name, table in written["properties"].items():
        assert table.get("description"), name


def test_it_offers_nothing_that_toml_cannot_write() -> None:
    assert "'null'" not in str(schema())
    assert "None" not in str(schema())

"""The JSON Schema of a lock."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import jsonschema
import pytest
import yaml

from beforehand.lock import Lock, lock_schema, lock_text
from beforehand.lock.record import Record
from beforehand.lock.schema import lock_schema_text

FILE = Path(__file__).parents[2] / "schemas" / "lock.schema.json"


def every_record() -> list[type[Record]]:
    """List every kind of record."""
    return sorted(Record.__subclasses__(), key=lambda kind: kind.__name__)


def test_the_schema_on_file_is_the_one_of_the_models() -> None:
    """schemas/lock.schema.json is generated; writing lock_schema_text() to it makes it true again."""
    assert FILE.read_text(encoding="utf-8") == lock_schema_text()


def test_the_schema_is_one_and_takes_a_lock(lock: Lock) -> None:
    """A lock on file fits the schema as YAML reads it."""
    schema = lock_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    content = yaml.safe_load(lock_text(lock))
    assert [error.message for error in jsonschema.Draft202012Validator(schema).iter_errors(content)] == []
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert schema["$id"] == "lock.schema.json"


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("digest", ""),
        ("status", "splendid"),
        ("lock", 2),
        ("more", 1),
        ("fits", [{"id": "1"}]),
        ("rulings", None),
    ],
)
def test_the_schema_refuses_what_the_models_refuse(lock: Lock, field: str, value: Any) -> None:
    """Unknown keys, words that are none of the given ones, and a missing digest are faults."""
    content = {**yaml.safe_load(lock_text(lock)), field: value}
    assert not jsonschema.Draft202012Validator(lock_schema()).is_valid(content)


@pytest.mark.parametrize("kind", every_record(), ids=lambda kind: kind.__name__)
def test_every_field_is_described(kind: type[Record]) -> None:
    """Whoever reads the schema finds what each field holds, in a sentence."""
    assert (kind.__doc__ or "").strip().endswith(".")
    for name, field in kind.model_fields.items():
        assert (field.description or "").endswith((".", ";")), f"{kind.__name__}.{name}"


@pytest.mark.parametrize("kind", every_record(), ids=lambda kind: kind.__name__)
def test_every_record_is_frozen_strict_and_closed(kind: type[Record]) -> None:
    """No record of a lock can change, coerces what it is given, or takes what it does not know."""
    config = kind.model_config
    assert (config["frozen"], config["strict"], config["extra"], config["allow_inf_nan"]) == (
        True,
        True,
        "forbid",
        False,
    )

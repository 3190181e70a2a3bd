"""The JSON Schema of the plan language: true to the models, and of use in an editor."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import jsonschema  # type: ignore[import-untyped]  # it comes without types
import pytest
import yaml

from beforehand.plan import Plan, plan_from_text, plan_schema, written_out
from beforehand.plan.schema import DIALECT, schema_text

FILE = Path(__file__).parents[2] / "schemas" / "plan.schema.json"


@pytest.fixture(scope="module")
def validator() -> jsonschema.Draft202012Validator:
    """What an editor checks with."""
    return jsonschema.Draft202012Validator(plan_schema())


def test_the_file_equals_the_models() -> None:
    """The schema in the repository is the one that the models make."""
    assert FILE.read_text(encoding="utf-8") == schema_text()


def test_it_is_a_schema() -> None:
    """It keeps the rules of its dialect and has a name of its own."""
    schema = plan_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    assert list(schema)[:2] == ["$schema", "$id"]
    assert (schema["$schema"], schema["$id"]) == (DIALECT, "plan.schema.json")
    assert schema["required"] == ["language", "title", "question", "data", "outcome", "predictors"]


def test_plans_pass(validator: jsonschema.Draft202012Validator, large: Plan, large_text: str) -> None:
    """A plan that is read passes, as written and written out."""
    validator.validate(json.loads(json.dumps(written_out(large))))
    validator.validate(json.loads(json.dumps(yaml.safe_load(large_text), default=str)))


def _properties(schema: Any) -> Iterator[tuple[str, dict[str, Any]]]:
    """Every property of every block."""
    for name, block in {"Plan": schema, **schema["$defs"]}.items():
        for key, field in block.get("properties", {}).items():
            yield f"{name}.{key}", field


def test_every_field_is_described() -> None:
    """An editor has something to say about every key, its own or its block's."""
    schema = plan_schema()
    for place, field in _properties(schema):
        block = schema["$defs"].get(str(field.get("$ref", "")).rpartition("/")[2], {})
        assert field.get("description") or block.get("description"), place


def test_every_optional_field_has_its_default() -> None:
    """A key that may be left out says what then holds."""
    schema = plan_schema()
    for name, block in {"Plan": schema, **schema["$defs"]}.items():
        if not name.endswith("Changes"):
            for key, field in block.get("properties", {}).items():
                assert key in block.get("required", ()) or "default" in field, f"{name}.{key}"


def test_every_block_is_closed() -> None:
    """No block takes an unknown key."""
    schema = plan_schema()
    for name, block in {"Plan": schema, **schema["$defs"]}.items():
        assert block.get("additionalProperties") is False, name


def test_words_are_listed() -> None:
    """A field of words lists them."""
    schema = plan_schema()
    assert schema["properties"]["multiplicity"]["enum"] == ["none", "holm", "benjamini_hochberg"]
    assert schema["properties"]["errors"]["oneOf"][0]["enum"] == ["classical", "hc0", "hc1", "hc2", "hc3"]
    assert schema["$defs"]["Transforms"]["properties"]["try"]["items"]["enum"][0] == "square"


WRONG = [
    {"alpha": 2},
    {"alpha": "small"},
    {"alfa": 0.05},
    {"errors": "robust"},
    {"influence": {"flag_when": {"leverage": "4/m"}}},
    {"predictors": []},
    {"eligibility": [{"column": "a", "is": 1, "above": 2, "because": "b"}]},
    {"keep": [{"predictor": "x", "rule": "allways", "because": "b"}]},
    {"alternatives": {"a": {}}},
    {"alternatives": {"a": {"title": "T"}}},
    {"language": 2},
]
RIGHT: list[dict[str, Any]] = [
    {"alpha": "5%"},
    {"errors": {"autocorrelation_lags": 3}},
    {"influence": {"flag_when": {"leverage": "2*p/n", "dffits": None}, "at_most": "0%"}},
    {"assumptions": {"curvature": "skip"}},
    {"alternatives": {"a": {"outcome": {"transforms": ["log"]}, "data": {"decimal": ","}}}},
    {"missing_data": {"fill": {"x": {"value": 0}, "z": "mean"}}},
    {"predictors": [{"column": "c", "kind": "category", "levels": [1, 2, True]}]},
]


@pytest.mark.parametrize(("blocks", "passes"), [(b, False) for b in WRONG] + [(b, True) for b in RIGHT])
def test_what_an_editor_says(
    blocks: dict[str, Any], passes: bool, validator: jsonschema.Draft202012Validator, small: dict[str, Any]
) -> None:
    """An editor marks what the reader would refuse, and leaves alone what it would read."""
    assert validator.is_valid({**small, **blocks}) is passes


def test_no_host_of_ours() -> None:
    """The only address in it is that of the dialect."""
    addresses = [part for part in schema_text().split('"') if "://" in part]
    assert addresses == [DIALECT]


def test_unquoted_text_is_no_fault_in_an_editor(
    large_text: str, validator: jsonschema.Draft202012Validator
) -> None:
    """Levels and codes that look like numbers or truth values are read without quotes, and pass."""
    text = large_text.replace("[dark, yellow, mixed], baseline: yellow", "[1, true, 2.5], baseline: 1")
    assert plan_from_text(text).predictors[3].levels == ("1", "true", "2.5")
    validator.validate(json.loads(json.dumps(yaml.safe_load(text), default=str)))

"""The JSON Schema of the plan language, with which an editor completes and checks a plan."""

from __future__ import annotations

import copy
import json
from typing import Any

from pydantic.json_schema import GenerateJsonSchema

from beforehand.plan.changes import NOT_CHANGED
from beforehand.plan.model import Plan
from beforehand.plan.written import FrozenMapping

DIALECT = "https://json-schema.org/draft/2020-12/schema"
NAME = "plan.schema.json"


class _Generator(GenerateJsonSchema):
    """Without the titles that only repeat the keys."""

    def field_title_should_be_set(self, schema: Any) -> bool:
        """Keys are their own titles."""
        return False

    def encode_default(self, dft: Any) -> Any:
        """Frozen mappings, which pydantic does not know how to write, as plain ones."""
        return super().encode_default(dict(dft) if isinstance(dft, FrozenMapping) else dft)


def plan_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of a plan file.

    Returns
    -------
    dict
        Every field with its description, its default, and its words or bounds. It says what an editor
        can check; what parts of a plan must fit each other is checked on reading.
    """
    schema = Plan.model_json_schema(by_alias=True, mode="validation", schema_generator=_Generator)
    definitions: dict[str, Any] = schema.pop("$defs")
    for definition in definitions.values():
        definition.pop("title", None)
    definitions |= _changes(schema, definitions)
    schema["properties"]["alternatives"]["additionalProperties"] = {"$ref": "#/$defs/Changes"}
    schema["title"] = "Plan of a multiple regression"
    return {
        "$schema": DIALECT,
        "$id": NAME,
        **schema,
        "$defs": {name: definitions[name] for name in sorted(definitions)},
    }


def schema_text() -> str:
    """The schema as it stands in ``schemas/plan.schema.json``."""
    return json.dumps(plan_schema(), indent=2, ensure_ascii=False) + "\n"


def _changes(schema: dict[str, Any], definitions: dict[str, Any]) -> dict[str, Any]:
    """What stands in one alternative: any decisions of the plan, none of them required."""
    added: dict[str, Any] = {}
    properties = {
        key: copy.deepcopy(value) for key, value in schema["properties"].items() if key not in NOT_CHANGED
    }
    for value in properties.values():
        value.pop("default", None)
        for holder in (value, *value.get("anyOf", ())):
            name = str(holder.get("$ref", "")).rpartition("/")[2]
            if "required" in definitions.get(name, {}):
                partial = {key: part for key, part in definitions[name].items() if key != "required"}
                added[f"{name}Changes"] = partial
                holder["$ref"] = f"#/$defs/{name}Changes"
    added["Changes"] = {
        "description": "Changes of the plan: blocks are merged key by key, lists and values are replaced.",
        "type": "object",
        "properties": properties,
        "additionalProperties": False,
        "minProperties": 1,
    }
    return added

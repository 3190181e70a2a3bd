"""The JSON Schema of a lock, generated from its models."""

from __future__ import annotations

import json
from typing import Any

from beforehand.lock.models import Lock
from beforehand.lock.record import Record

DIALECT = "https://json-schema.org/draft/2020-12/schema"
SCHEMA_ID = "lock.schema.json"

_FILE_DIGEST = "^sha256:[0-9a-f]{64}$"


def record_schema(model: type[Record], schema_id: str) -> dict[str, Any]:
    """Describe the file of a record that ends in its digest.

    Returns
    -------
    dict
        A JSON Schema (2020-12) of the file's content. A record on file always has its digest.
    """
    made = model.model_json_schema()
    made["properties"]["digest"] = {
        "description": made["properties"]["digest"]["description"],
        "pattern": _FILE_DIGEST,
        "title": "Digest",
        "type": "string",
    }
    made["required"] = [*made["required"], "digest"]
    return {"$schema": DIALECT, "$id": schema_id, **made}


def lock_schema() -> dict[str, Any]:
    """Describe a lockfile."""
    return record_schema(Lock, SCHEMA_ID)


def lock_schema_text() -> str:
    """Write the schema as it stands in its file."""
    return json.dumps(lock_schema(), indent=2, ensure_ascii=False) + "\n"

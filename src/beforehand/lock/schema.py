"""The JSON Schema of a lock, generated from its models."""

from __future__ import annotations

import json
from typing import Any

from beforehand.lock.models import Lock

DIALECT = "https://json-schema.org/draft/2020-12/schema"
SCHEMA_ID = "lock.schema.json"

_FILE_DIGEST = "^sha256:[0-9a-f]{64}$"


def lock_schema() -> dict[str, Any]:
    """Describe a lockfile.

    Returns
    -------
    dict
        A JSON Schema (2020-12) of the file's content. A lock on file always has its digest.
    """
    made = Lock.model_json_schema()
    made["properties"]["digest"] = {
        "description": made["properties"]["digest"]["description"],
        "pattern": _FILE_DIGEST,
        "title": "Digest",
        "type": "string",
    }
    made["required"] = [*made["required"], "digest"]
    return {"$schema": DIALECT, "$id": SCHEMA_ID, **made}


def lock_schema_text() -> str:
    """Write the schema as it stands in its file."""
    return json.dumps(lock_schema(), indent=2, ensure_ascii=False) + "\n"

"""From the record of a rehearsal to its text and its file."""

from __future__ import annotations

import json
import os
from typing import Any

from beforehand.lock.files import write_whole
from beforehand.lock.schema import DIALECT
from beforehand.lock.writing import covered_text, digest_of, record_text
from beforehand.rehearsing.models import RehearsalRecord

SCHEMA_ID = "rehearsal.schema.json"

_FILE_DIGEST = "^sha256:[0-9a-f]{64}$"


def rehearsal_record_text(record: RehearsalRecord) -> str:
    """Write a record out with its digest: LF line ends; the same record gives the same text."""
    return record_text(record)


def with_digest(record: RehearsalRecord) -> RehearsalRecord:
    """Give a record made in memory as it reads back from its file."""
    return record.model_copy(update={"digest": digest_of(covered_text(record).encode())})


def write_rehearsal(record: RehearsalRecord, path: str | os.PathLike[str]) -> None:
    """Write a record to a file, whole or not at all.

    Raises
    ------
    WriteError
        The file cannot be written; what stood there is untouched.
    """
    write_whole(path, rehearsal_record_text(record).encode())


def rehearsal_schema() -> dict[str, Any]:
    """Describe the file of a rehearsal.

    Returns
    -------
    dict
        A JSON Schema (2020-12) of the file's content. A record on file always has its digest.
    """
    made = RehearsalRecord.model_json_schema()
    made["properties"]["digest"] = {
        "description": made["properties"]["digest"]["description"],
        "pattern": _FILE_DIGEST,
        "title": "Digest",
        "type": "string",
    }
    made["required"] = [*made["required"], "digest"]
    return {"$schema": DIALECT, "$id": SCHEMA_ID, **made}


def rehearsal_schema_text() -> str:
    """Write the schema as it stands in its file."""
    return json.dumps(rehearsal_schema(), indent=2, ensure_ascii=False) + "\n"

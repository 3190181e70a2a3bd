"""From the record of a rehearsal to its text and its file."""

from __future__ import annotations

import json
import os
from typing import Any

from beforehand.lock.files import write_whole
from beforehand.lock.schema import record_schema
from beforehand.lock.writing import covered_text, digest_of, record_text
from beforehand.rehearsing.models import RehearsalRecord

SCHEMA_ID = "rehearsal.schema.json"


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
    """Describe the file of a rehearsal."""
    return record_schema(RehearsalRecord, SCHEMA_ID)


def rehearsal_schema_text() -> str:
    """Write the schema as it stands in its file."""
    return json.dumps(rehearsal_schema(), indent=2, ensure_ascii=False) + "\n"

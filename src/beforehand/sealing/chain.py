"""Records that hang together: each holds the digest of the one before, so that none can go unnoticed."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from typing import Any

from beforehand.faults import Fault, LockError


def digest_of(record: Mapping[str, Any]) -> str:
    """The digest of a record of plain data, without the digest that it carries itself.

    Parameters
    ----------
    record : mapping
        Of mappings, lists, texts, finite numbers, truth values and None.

    Returns
    -------
    str
        Of the content only: neither the order of keys nor 3 beside 3.0 makes another digest.
    """
    content = {key: value for key, value in record.items() if key != "digest"}
    text = json.dumps(_plain(content), sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return f"sha256:{hashlib.sha256(text.encode()).hexdigest()}"


def broken_link(records: Sequence[Mapping[str, Any]]) -> tuple[int, str] | None:
    """The first record at which a chain breaks, and why.

    Parameters
    ----------
    records : sequence of mapping
        In order, each with ``previous`` and ``digest``.

    Returns
    -------
    tuple of int and str, or None
        The place of the record from 0, and what is wrong; None for a whole chain.
    """
    before: str | None = None
    for place, record in enumerate(records):
        if record.get("digest") != digest_of(record):
            return place, "it was changed after it was written: its digest does not fit"
        if record.get("previous") != before:
            return place, "it does not follow on the one before: one was taken out, put in or moved"
        before = str(record["digest"])
    return None


def refused(file: str, what: str, code: str, line: int | None = None) -> LockError:
    """The error of one fault of a chain's file."""
    return LockError([Fault(file=file, line=line, place="", what=what, code=code)])


def _plain(value: Any) -> Any:
    """Numbers that are whole as whole numbers, tuples as lists."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, float) and value.is_integer():
        return int(value)
    return str(value) if isinstance(value, str) else value

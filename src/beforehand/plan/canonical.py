"""The plan with every default written out, as data and as text, and the digests taken of it."""

from __future__ import annotations

import datetime
import hashlib
import json
from collections.abc import Mapping
from typing import Any

from beforehand.plan.block import Block
from beforehand.plan.limits import Limit
from beforehand.plan.model import Plan
from beforehand.plan.yaml_text import yaml_text


def written_out(plan: Plan) -> dict[str, Any]:
    """The plan as plain data, with the keys of the file and every default.

    Returns
    -------
    dict
        Of dicts, lists, text, numbers, truth values and None, in the order of the language. Reading
        it with ``plan_from_mapping`` gives an equal plan.
    """
    return _block(plan)


def canonical_text(plan: Plan) -> str:
    """The written-out plan as YAML; reading it gives an equal plan."""
    return yaml_text(written_out(plan))


def whole_digest(plan: Plan) -> str:
    """Digest of every word of the plan, ``sha256:…``.

    It is taken of the written-out plan as JSON with sorted keys and without blanks, in UTF-8, so that
    comments, quotes, blanks and the order of keys do not touch it.
    """
    return _digest(written_out(plan))


def decisions_digest(plan: Plan) -> str:
    """Digest of all that can change a number, a ruling or a verdict, ``sha256:…``.

    Titles, reasons, sources, units, how labels are shown and the list of amendments are words. An
    alternative counts by the plan that it leads to.
    """
    return _digest(decisions(plan))


def decisions(plan: Plan) -> dict[str, Any]:
    """The written-out plan without its words, and lists sorted where their order means nothing."""
    from beforehand.plan.changes import with_changes

    found = _block(plan, words=False)
    found["alternatives"] = {
        name: _block(with_changes(plan, changes), words=False) for name, changes in plan.alternatives.items()
    }
    return found


def _block(block: Block, *, words: bool = True) -> dict[str, Any]:
    """One block under the keys of the file."""
    kind = type(block)
    data: dict[str, Any] = {}
    for name, field in kind.model_fields.items():
        value = getattr(block, name)
        if (not words and name in kind.words) or (name in kind.left_out and (value is None or value == ())):
            continue
        plain = _plain(value, words=words)
        if not words and name in kind.unordered and plain is not None:
            plain = sorted(plain, key=_sortable)
        data[field.alias or name] = plain
    return data


def _sortable(item: Any) -> tuple[bool, Any]:
    """What an item of a list whose order means nothing is sorted by; a block goes by its text."""
    return isinstance(item, str), str(item) if isinstance(item, dict) else item


def _plain(value: Any, *, words: bool) -> Any:
    """A value as plain data."""
    if isinstance(value, Block):
        return _block(value, words=words)
    if isinstance(value, Limit):
        return value.text if value.constant is None else value.constant
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, Mapping):
        return {name: _plain(item, words=words) for name, item in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(item, words=words) for item in value]
    return value


def _digest(data: Mapping[str, Any]) -> str:
    """Digest of data as JSON."""
    text = json.dumps(data, sort_keys=True, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return "sha256:" + hashlib.sha256(text.encode("utf-8")).hexdigest()

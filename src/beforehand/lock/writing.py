"""From a lock to its text: one fact a line where a reviewer would look for one.

What is read in a review stands in block style; what is a row of a table (a term, a correlation, a
flagged row) is one flow line. Nothing wraps, and no choice of layout hangs on a computed number, so
that a line of a difference is a difference of the record.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Callable, Iterator, Mapping
from functools import cache
from operator import attrgetter
from typing import Any

from beforehand.lock.answer import Answer, Fragility
from beforehand.lock.checks import Checks
from beforehand.lock.files import write_whole
from beforehand.lock.models import Alternative, DataRecord, Environment, Lock, PlanRecord, SealRecord
from beforehand.lock.numbers import exact_text, number_text
from beforehand.lock.record import Plain, Record
from beforehand.lock.strings import string_text
from beforehand.lock.trail import FitRecord, PredictorFate, RulingRecord

HEADER = (
    "# Written by beforehand. Do not edit: the digest at the end covers every line above the environment.\n"
)

# Where the digest stops: what a run was made with may differ while the record is the same.
DIGEST_ENDS_AT = "environment:"

# Names of fields that stand in quotes.
_NOT_PLAIN = frozenset({"true", "false", "null"})

_NOT_COVERED = frozenset({"environment", "digest"})

# Records of which every field has a line of its own; any other is one flow line.
_IN_BLOCKS: frozenset[type] = frozenset(
    {Alternative, Answer, Checks, DataRecord, Environment, FitRecord, Fragility, Lock, PlanRecord}
    | {PredictorFate, RulingRecord, SealRecord}
)

# Lists of sentences, one a line; other lists of text hold numbers of fits, rulings and checks.
_SENTENCES = frozenset({"cautions", "differences"})

# Mappings that hold what a person wrote, not what a run computed.
_WRITTEN_BY_HAND = frozenset({"written", "changes"})

# Parts of the plan that fit into so many characters stay on one line. A plan changes by its
# author's hand only, so this choice does not move between runs.
_PLAN_LINE = 110

Format = Callable[[Any], str]


def lock_text(lock: Lock) -> str:
    """Write a lock out, with its digest.

    Parameters
    ----------
    lock : Lock
        Any lock; a digest it carries already is not looked at.

    Returns
    -------
    str
        The text of the file: LF line ends, a final newline, the digest as its last line. The same
        record gives the same text.
    """
    return record_text(lock)


def record_text(record: Record) -> str:
    """Write out a lock, or any other record that ends in an environment and a digest.

    Parameters
    ----------
    record : Record
        Its last two fields are ``environment`` and ``digest``; the digest is not looked at.

    Returns
    -------
    str
        As of `lock_text`.
    """
    covered = covered_text(record)
    rest = "".join(f"{line}\n" for line in _fields(record, ("environment",), ""))
    return f"{covered}{rest}digest: {string_text(digest_of(covered.encode()))}\n"


def sealed_lock(lock: Lock) -> Lock:
    """Give a lock as it reads back from its file.

    Parameters
    ----------
    lock : Lock
        A lock made in memory.

    Returns
    -------
    Lock
        The same with its digest.
    """
    return lock.model_copy(update={"digest": digest_of(covered_text(lock).encode())})


def covered_text(record: Record) -> str:
    """Write the part of a record that its digest covers: all above the environment."""
    covered = tuple(name for name in type(record).model_fields if name not in _NOT_COVERED)
    return HEADER + "".join(f"{line}\n" for line in _fields(record, covered, ""))


def one_line(value: object) -> str:
    """Write any value of a lock as it would stand on one line of the file."""
    return _flow(value)


def write_lock(lock: Lock, path: str | os.PathLike[str]) -> None:
    """Write a lock to a file, whole or not at all.

    Parameters
    ----------
    lock : Lock
        The lock.
    path : path
        Where it shall stand; what stands there is replaced.

    Raises
    ------
    WriteError
        The file cannot be written; what stood there is untouched.
    """
    write_whole(path, lock_text(lock).encode())


def digest_of(covered: bytes) -> str:
    """Take the digest of the bytes above the environment."""
    return f"sha256:{hashlib.sha256(covered).hexdigest()}"


def _nothing(_: None) -> str:
    return "null"


def _truth(value: bool) -> str:
    return "true" if value else "false"


_COMPUTED: Mapping[type, Format] = {
    float: number_text,
    str: string_text,
    int: str,
    bool: _truth,
    type(None): _nothing,
}
_AS_GIVEN: Mapping[type, Format] = {**_COMPUTED, float: exact_text}


@cache
def _fields_of(kind: type[Record]) -> tuple[tuple[str, ...], Callable[[Any], Any]]:
    """Names of a record's fields, and what takes their values in that order."""
    names = tuple([field.alias or name for name, field in kind.model_fields.items()])
    return names, attrgetter(*kind.model_fields)


@cache
def _template(names: tuple[str, ...]) -> str:
    """Make a record's flow line with a place for each value."""
    return "{" + ", ".join([f"{_key(name)}: %s" for name in names]) + "}"


def _key(name: str) -> str:
    """Write the name of a field; a few words would be read as a value (not ``n``, which locks have)."""
    return f'"{name}"' if name in _NOT_PLAIN else name


def _flow(value: Any, formats: Mapping[type, Format] = _COMPUTED) -> str:
    """Any value on one line."""
    scalar = formats.get(type(value))
    if scalar is not None:
        return scalar(value)
    if isinstance(value, Record):
        names, values_of = _fields_of(type(value))
        values = values_of(value)
        if value.left_out:
            # What most records have not is left out where it is null, so that a line can be read.
            present = [
                n for n, item in enumerate(values) if item is not None or names[n] not in value.left_out
            ]
            names, values = tuple([names[n] for n in present]), [values[n] for n in present]
        # Scalars are most of what a lock holds: they are written here, without another call.
        return _template(names) % tuple(
            [
                write(item) if (write := formats.get(type(item))) is not None else _flow(item)
                for item in values
            ]
        )
    if isinstance(value, Mapping):
        entries = [f"{string_text(key)}: {_flow(item, formats)}" for key, item in value.items()]
        return "{" + ", ".join(entries) + "}"
    return "[" + ", ".join([_flow(item, formats) for item in value]) + "]"


def _fields(record: Record, names: tuple[str, ...], indent: str) -> Iterator[str]:
    """Lines of a record in block style."""
    for name in names:
        value = getattr(record, name)
        if value is None and name in record.left_out:
            continue
        sentences = name in _SENTENCES or name in record.sentences
        name = _key(type(record).model_fields[name].alias or name)
        if isinstance(value, Record) and _in_blocks(value):
            lines = tuple(_block(value, f"{indent}  "))
            yield f"{indent}{name}:" if lines else f"{indent}{name}: {{}}"
            yield from lines
        elif isinstance(value, tuple) and value and (isinstance(value[0], Record) or sentences):
            yield f"{indent}{name}:"
            for item in value:
                yield from _item(item, f"{indent}  ")
        elif isinstance(value, Mapping) and _holds_records(value):
            yield f"{indent}{name}:"
            for key, item in value.items():
                if isinstance(item, Record) and _in_blocks(item):
                    yield f"{indent}  {string_text(key)}:"
                    yield from _block(item, f"{indent}    ")
                else:
                    yield f"{indent}  {string_text(key)}: {_flow(item)}"
        elif isinstance(value, Mapping) and value and name in _WRITTEN_BY_HAND:
            yield f"{indent}{name}:"
            yield from _plain_block(value, f"{indent}  ")
        else:
            yield f"{indent}{name}: {_flow(value)}"


def _block(record: Record, indent: str) -> Iterator[str]:
    """Lines of a whole record in block style."""
    return _fields(record, tuple(type(record).model_fields), indent)


def _item(item: Any, indent: str) -> Iterator[str]:
    """Lines of an item of a list."""
    if isinstance(item, Record) and _in_blocks(item):
        lines = _block(item, f"{indent}  ")
        yield f"{indent}- {next(lines).lstrip(' ')}"
        yield from lines
    else:
        yield f"{indent}- {_flow(item)}"


def _in_blocks(record: Record) -> bool:
    """Whether every field of a record has a line of its own."""
    return record.in_blocks or type(record) in _IN_BLOCKS


def _holds_records(value: Mapping[str, Any]) -> bool:
    """Whether a mapping is one of records by name."""
    return any(isinstance(item, Record) for item in value.values())


def _plain_entry(key: str, value: Plain | Mapping[str, Plain], indent: str) -> Iterator[str]:
    """Lines of one entry of plain data, in block style where one line would hold or be too much."""
    name = string_text(key)
    line = f"{indent}{name}: {_flow(value, _AS_GIVEN)}"
    if (
        not value
        or not isinstance(value, tuple | Mapping)
        or (len(line) <= _PLAN_LINE and not _is_table(value))
    ):
        yield line
    elif isinstance(value, Mapping):
        yield f"{indent}{name}:"
        yield from _plain_block(value, f"{indent}  ")
    else:
        yield f"{indent}{name}:"
        for item in value:
            yield from _plain_item(item, f"{indent}  ")


def _plain_block(value: Mapping[str, Plain], indent: str) -> Iterator[str]:
    """Lines of a mapping of plain data in block style."""
    for key, item in value.items():
        yield from _plain_entry(key, item, indent)


def _is_table(value: tuple[Plain, ...] | Mapping[str, Plain]) -> bool:
    """Whether something is a list of mappings, such as predictors: each of them has its line."""
    return isinstance(value, tuple) and any(isinstance(item, Mapping) for item in value)


def _plain_item(item: Plain, indent: str) -> Iterator[str]:
    """Lines of one item of plain data; a list within a list stays on one line."""
    line = f"{indent}- {_flow(item, _AS_GIVEN)}"
    if not item or not isinstance(item, Mapping) or len(line) <= _PLAN_LINE:
        yield line
        return
    lines = _plain_block(item, f"{indent}  ")
    yield f"{indent}- {next(lines).lstrip(' ')}"
    yield from lines

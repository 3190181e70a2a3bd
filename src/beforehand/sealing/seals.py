"""Seals of a plan: what was fixed, when, by whom, and what had been seen by then.

The file ``NAME.seal.yaml`` is a chain: each seal holds the digest of the one before and the plan as
it was, so that the sealed version can be run later, whatever became of the plan's own file.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from beforehand.lock.files import write_whole
from beforehand.plan import Plan, decisions_digest, plan_from_mapping, whole_digest, written_out
from beforehand.plan.yaml_nodes import NotYamlError, decoded, document_of, typed
from beforehand.plan.yaml_text import yaml_text
from beforehand.sealing.chain import broken_link, digest_of, refused
from beforehand.sealing.holding import held

Seen = Literal["nothing", "predictors", "everything"]
SEEN: tuple[Seen, ...] = ("nothing", "predictors", "everything")
Kind = Literal["unforeseen", "mistake", "gap", "assumption_failed"]
KINDS: tuple[Kind, ...] = ("unforeseen", "mistake", "gap", "assumption_failed")

HEADER = "# Written by beforehand. Do not edit: each seal holds the digest of the one before.\n"

# A thousand seals of a large plan stay below it.
LARGEST = 1 << 27

_KEYS = (
    "seal",
    "previous",
    "sealed",
    "by",
    "seen",
    "plan",
    "data",
    "commit",
    "amendment",
    "written",
    "digest",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Amendment:
    """Why a sealed plan was changed.

    Attributes
    ----------
    why : str
    kind : str or None
        ``unforeseen``, ``mistake``, ``gap`` or ``assumption_failed``; None where it was not said.
    expected_effect : str or None
    changes : tuple of mapping
        Each with ``clause``, ``class`` and ``says``.
    """

    why: str
    kind: Kind | None
    expected_effect: str | None
    changes: tuple[Mapping[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Seal:
    """One seal.

    Attributes
    ----------
    number : int
        From 1.
    sealed : str
        Date and time, UTC.
    by : str
    seen : str
        What had been seen of the data: ``nothing``, ``predictors`` or ``everything``.
    decisions, whole : str
        The plan's two digests.
    file : str
        The plan's file, without a folder.
    data : str or None
        Fingerprint of the table, if it was there.
    commit : str or None
        Commit of the repository that the plan stood in.
    amendment : Amendment or None
    written : mapping
        The plan with all defaults written out.
    digest : str
    """

    number: int
    sealed: str
    by: str
    seen: Seen
    file: str
    decisions: str
    whole: str
    data: str | None
    commit: str | None
    amendment: Amendment | None
    written: Mapping[str, Any]
    digest: str

    def plan(self) -> Plan:
        """The plan as it was sealed. Raises PlanError where this program cannot read it."""
        return plan_from_mapping(self.written, self.file)


def read_seals(path: Path) -> tuple[Seal, ...]:
    """The seals of a file, in order; none where there is no file.

    Raises
    ------
    LockError
        With the place where the chain breaks, or the line that cannot be read.
    """
    return tuple(_seal_of(record) for record in _records(path))


def append_seal(
    path: Path,
    plan: Plan,
    *,
    file: str,
    by: str,
    seen: Seen,
    sealed: str,
    data: str | None,
    commit: str | None,
    amendment: Amendment | None,
) -> Seal:
    """Append a seal to a plan's chain.

    Raises
    ------
    LockError
        The chain is broken; nothing is appended to it.
    WriteError
        The file cannot be written; it is as it was.
    """
    with held(path):
        records = _records(path)
        record: dict[str, Any] = {
            "seal": len(records) + 1,
            "previous": records[-1]["digest"] if records else None,
            "sealed": sealed,
            "by": by,
            "seen": seen,
            "plan": {"file": file, "decisions": decisions_digest(plan), "whole": whole_digest(plan)},
            "data": data,
            "commit": commit,
            "amendment": None
            if amendment is None
            else {
                "why": amendment.why,
                "kind": amendment.kind,
                "expected_effect": amendment.expected_effect,
                "changes": [dict(change) for change in amendment.changes],
            },
            "written": written_out(plan),
        }
        record["digest"] = digest_of(record)
        content = (HEADER + yaml_text({"seals": [*records, record]})).encode()
        # What could not be read again must not take the place of what can.
        _chain_of(content, str(path))
        write_whole(path, content)
        # As it stands in the file, which is what every later reader gets.
        return read_seals(path)[-1]


def _records(path: Path) -> list[dict[str, Any]]:
    """The chain as plain data, every link of it checked."""
    name = str(path)
    try:
        raw = path.read_bytes()
    except FileNotFoundError:
        return []
    except OSError as error:
        reason = (error.strerror or "the system refuses").lower()
        raise refused(name, f"it cannot be read: {reason}", "seal.unreadable") from error
    return _chain_of(raw, name)


def _chain_of(raw: bytes, name: str) -> list[dict[str, Any]]:
    """The chain that a file's content holds."""
    try:
        document = document_of(decoded(raw, most_bytes=LARGEST))
    except NotYamlError as broken:
        raise refused(name, broken.fault.what, "seal.yaml", broken.fault.line) from None
    found = typed(document.data)
    records = found.get("seals") if isinstance(found, dict) and set(found) == {"seals"} else None
    if document.faults or not isinstance(records, tuple) or not records:
        raise refused(name, "it is no file of seals", "seal.layout", 1)
    for number, record in enumerate(records, 1):
        line = document.lines.get(f"seals[{number - 1}]")
        if not isinstance(record, dict) or set(record) != set(_KEYS) or record["seal"] != number:
            raise refused(name, f"seal {number} is not one that this program writes", "seal.layout", line)
    chain = [dict(record) for record in records if isinstance(record, dict)]
    broken_at = broken_link(chain)
    if broken_at is not None:
        place, why = broken_at
        line = document.lines.get(f"seals[{place}]")
        raise refused(name, f"the chain of seals is broken at seal {place + 1}: {why}", "seal.chain", line)
    return chain


def _seal_of(record: Mapping[str, Any]) -> Seal:
    """A checked record as a seal."""
    plan, amendment = record["plan"], record["amendment"]
    return Seal(
        number=int(record["seal"]),
        sealed=str(record["sealed"]),
        by=str(record["by"]),
        seen=record["seen"],
        file=str(plan["file"]),
        decisions=str(plan["decisions"]),
        whole=str(plan["whole"]),
        data=record["data"],
        commit=record["commit"],
        amendment=None
        if amendment is None
        else Amendment(
            why=str(amendment["why"]),
            kind=amendment["kind"],
            expected_effect=amendment["expected_effect"],
            changes=tuple(amendment["changes"]),
        ),
        written=record["written"],
        digest=str(record["digest"]),
    )

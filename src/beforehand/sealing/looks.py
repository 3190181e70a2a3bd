"""The register of looks: one line for each run of a plan on real data, each linked to the one before.

The order of lines is the chain's; the date on a line is information and nothing rests on it.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from beforehand.lock.files import write_whole
from beforehand.sealing.chain import broken_link, digest_of, refused
from beforehand.sealing.holding import held

_KEYS = frozenset({"look", "previous", "date", "outcome", "plan", "data", "lock", "status", "seal", "digest"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Look:
    """One run on real data.

    Attributes
    ----------
    number : int
        From 1.
    date : str
        UTC.
    outcome : str
        The outcome's column.
    plan, data, lock : str
        Digest of the plan's decisions, fingerprint of the table, digest of the lock.
    status : str
        How the run ended.
    seal : str or None
        Digest of the last seal that stood beside the plan; None where there was none.
    """

    number: int
    date: str
    outcome: str
    plan: str
    data: str
    lock: str
    status: str
    seal: str | None


def read_looks(path: Path) -> tuple[Look, ...]:
    """The looks of a register, in order; none where there is no file.

    Raises
    ------
    LockError
        With the line at which the chain breaks.
    """
    return tuple(_look_of(record) for record in _records(path))


def add_look(
    path: Path, *, date: str, outcome: str, plan: str, data: str, lock: str, status: str, seal: str | None
) -> tuple[Look, ...]:
    """Add a run to a register; two runs at once both get their line.

    Returns
    -------
    tuple of Look
        All looks, the new one last.

    Raises
    ------
    LockError
        The chain is broken; nothing is added to it.
    WriteError
        The register cannot be written; it is as it was.
    """
    with held(path):
        records = _records(path)
        record: dict[str, Any] = {
            "look": len(records) + 1,
            "previous": records[-1]["digest"] if records else None,
            "date": date,
            "outcome": outcome,
            "plan": plan,
            "data": data,
            "lock": lock,
            "status": status,
            "seal": seal,
        }
        record["digest"] = digest_of(record)
        records.append(record)
        lines = [json.dumps(one, ensure_ascii=False) + "\n" for one in records]
        write_whole(path, "".join(lines).encode())
    return tuple(_look_of(one) for one in records)


def plans_that_met(looks: Sequence[Look], outcome: str) -> int:
    """How many different plans have met an outcome: by their decisions, whatever their words."""
    return len({look.plan for look in looks if look.outcome == outcome})


def _records(path: Path) -> list[dict[str, Any]]:
    """The register as plain data, every link of it checked."""
    name = str(path)
    try:
        text = path.read_bytes().decode("utf-8")
    except FileNotFoundError:
        return []
    except UnicodeDecodeError:
        raise refused(name, "it is not UTF-8 text", "looks.encoding") from None
    except OSError as error:
        reason = (error.strerror or "the system refuses").lower()
        raise refused(name, f"it cannot be read: {reason}", "looks.unreadable") from error
    records: list[dict[str, Any]] = []
    for number, line in enumerate(text.splitlines(), 1):
        try:
            record = json.loads(line)
        except ValueError:
            record = None
        if not isinstance(record, dict) or set(record) != _KEYS or record["look"] != number:
            raise refused(
                name,
                f"the register of looks is broken: line {number} is not look {number}",
                "looks.layout",
                number,
            )
        records.append(record)
    broken_at = broken_link(records)
    if broken_at is not None:
        place, why = broken_at
        raise refused(
            name, f"the register of looks is broken at look {place + 1}: {why}", "looks.chain", place + 1
        )
    return records


def _look_of(record: dict[str, Any]) -> Look:
    return Look(
        number=int(record["look"]),
        date=str(record["date"]),
        outcome=str(record["outcome"]),
        plan=str(record["plan"]),
        data=str(record["data"]),
        lock=str(record["lock"]),
        status=str(record["status"]),
        seal=record["seal"],
    )

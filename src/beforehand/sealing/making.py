"""Sealing a plan: what is looked at, what is refused, and what goes into the seal."""

from __future__ import annotations

import subprocess
from datetime import UTC, datetime
from pathlib import Path

from beforehand.comparing import plan_changes
from beforehand.faults import DataError, Fault, InputError, did_you_mean
from beforehand.names import seal_path
from beforehand.plan import Plan, decisions_digest, whole_digest
from beforehand.sealing.seals import KINDS, SEEN, Amendment, Seal, append_seal, read_seals
from beforehand.table import read_table

# The repository may be on a slow disk; a seal does not wait longer for its commit.
_PATIENCE = 10.0


def seal_plan(
    plan: Plan,
    path: Path,
    *,
    by: str,
    seen: str,
    data: Path | None = None,
    amend: str | None = None,
    kind: str | None = None,
    expected_effect: str | None = None,
    now: datetime | None = None,
) -> tuple[Seal, bool]:
    """Seal a plan as it is.

    Parameters
    ----------
    plan : Plan
    path : Path
        Its file.
    by, seen : str
        Who seals, and what has been seen: ``nothing``, ``predictors`` or ``everything``.
    data : Path, optional
        The table; without it the one that the plan names, if it is there.
    amend : str, optional
        Why a plan that was sealed before is changed.
    kind, expected_effect : str, optional
        Of an amendment.
    now : datetime, optional
        The time; the clock's by default.

    Returns
    -------
    tuple of Seal and bool
        The seal in force, and whether it is new: a plan that is sealed as it is is not sealed again.

    Raises
    ------
    InputError
        Something said about the seal cannot be used, or a changed plan is sealed without a reason.
    LockError
        The chain is broken.
    """
    faults = list(_faults(str(path), by, seen, amend, kind, expected_effect))
    seals = read_seals(seal_path(path))
    last = seals[-1] if seals else None
    if amend is not None and last is None:
        faults.append(_fault(str(path), "amend", "there is no seal to amend: seal it without --amend first"))
    same = last is not None and last.whole == whole_digest(plan)
    differs = last is not None and last.decisions != decisions_digest(plan)
    if amend is not None and last is not None and same:
        faults.append(_fault(str(path), "amend", f"nothing differs from seal {last.number}"))
    if amend is None and last is not None and differs:
        what = f"decisions differ from seal {last.number} of {last.sealed}: say why with --amend"
        faults.append(_fault(str(path), "seal", what))
    if faults:
        raise InputError(faults)
    if last is not None and same:
        return last, False
    amendment = None
    if amend is not None and last is not None:
        changes = tuple(
            {"clause": change.clause, "class": change.grade, "says": change.says}
            for change in plan_changes(last.plan(), plan)
        )
        amendment = Amendment(
            why=amend.strip(),
            kind=next((known for known in KINDS if known == kind), None),
            expected_effect=expected_effect,
            changes=changes,
        )
    moment = (datetime.now(UTC) if now is None else now).astimezone(UTC)
    seal = append_seal(
        seal_path(path),
        plan,
        file=path.name,
        by=by.strip(),
        seen=next(known for known in SEEN if known == seen),
        sealed=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        data=_fingerprint(plan, data),
        commit=_commit(path),
        amendment=amendment,
    )
    return seal, True


def _faults(
    file: str, by: str, seen: str, amend: str | None, kind: str | None, expected_effect: str | None
) -> list[Fault]:
    """What is wrong with the words of a seal."""
    found: list[Fault] = []
    if not by.strip():
        found.append(_fault(file, "by", "says nobody: name who seals"))
    for place, text in (("by", by), ("amend", amend or ""), ("expected_effect", expected_effect or "")):
        if any(not sign.isprintable() for sign in text):
            found.append(_fault(file, place, "holds a sign that does not print: write it on one line"))
    if seen not in SEEN:
        found.append(
            _fault(file, "seen", f"{seen!r} is not one of {', '.join(SEEN)}{did_you_mean(seen, SEEN)}")
        )
    if amend is not None and not amend.strip():
        found.append(_fault(file, "amend", "says nothing: give the reason of the change"))
    if amend is None and (kind is not None or expected_effect is not None):
        found.append(
            _fault(file, "amend", "a kind or an expected effect belongs to an amendment: add --amend")
        )
    if kind is not None and kind not in KINDS:
        found.append(
            _fault(file, "kind", f"{kind!r} is not one of {', '.join(KINDS)}{did_you_mean(kind, KINDS)}")
        )
    return found


def _fault(file: str, place: str, what: str) -> Fault:
    return Fault(file=file, line=None, place=place, what=what, code=f"seal.{place}")


def _fingerprint(plan: Plan, data: Path | None) -> str | None:
    """The table's fingerprint, or None where there is no table yet, or none that keeps the contract.

    A table that was named for the purpose must keep it.
    """
    if data is not None:
        return read_table(plan, data).fingerprint
    try:
        return read_table(plan).fingerprint
    except DataError:
        return None


def _commit(path: Path) -> str | None:
    """The commit that the plan's folder stands at; None outside of a repository, or without git."""
    try:
        done = subprocess.run(
            ["git", "rev-parse", "HEAD"],
            cwd=path.resolve().parent,
            capture_output=True,
            text=True,
            timeout=_PATIENCE,
            check=False,
        )
    except (OSError, subprocess.SubprocessError):
        return None
    return done.stdout.strip() or None if done.returncode == 0 else None

"""What ``--json`` prints: the keys of each command's result, in one place because they are a promise."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from beforehand.api import Replay
    from beforehand.handing import Handover, Received
    from beforehand.lock import Lock
    from beforehand.plan import Plan
    from beforehand.review import Review
    from beforehand.sealing import Look, Seal


def check_result(reviewed: Review, plan: Plan | None) -> dict[str, Any]:
    """What a reviewer should know; with a plan, the plan with every default written out."""
    from beforehand.plan import written_out
    from beforehand.review import findings_of

    result: dict[str, Any] = {
        "usable": True,
        "cautions": sum(finding.severity == "caution" for finding in findings_of(reviewed)),
        "review": reviewed,
    }
    return result if plan is None else result | {"plan": written_out(plan)}


def run_result(
    lock: Lock, record: str, looks: Sequence[Look] = (), rehearsed: Sequence[str] = ()
) -> dict[str, Any]:
    """The answer of a run and what left; everything else is in the record."""
    return {
        "status": lock.status,
        "record": record,
        "digest": lock.digest,
        "plan": {"file": lock.plan.file, "decisions": lock.plan.decisions, "whole": lock.plan.whole},
        "seal": lock.seal,
        "looks": len(looks),
        "rehearsed": rehearsed,
        "data": lock.data,
        "answer": lock.answer,
        "sealed_answer": lock.sealed_answer,
        "ledger": lock.ledger,
        "rows_removed": lock.rows_removed,
        "predictors": lock.predictors,
        "alternatives": {
            name: {"status": other.status, "holds": other.holds, "differences": other.differences}
            for name, other in lock.alternatives.items()
        },
        "rulings": len(lock.rulings),
        "fits": len(lock.fits),
    }


def seal_result(seal: Seal, where: str, new: bool) -> dict[str, Any]:
    """The seal in force, and whether it was made just now."""
    return {
        "new": new,
        "file": where,
        "seal": seal.number,
        "sealed": seal.sealed,
        "by": seal.by,
        "seen": seal.seen,
        "plan": {"file": seal.file, "decisions": seal.decisions, "whole": seal.whole},
        "data": seal.data,
        "commit": seal.commit,
        "amendment": seal.amendment,
        "digest": seal.digest,
    }


def replay_result(again: Replay) -> dict[str, Any]:
    """Whether a record came out the same, and every difference with its place."""
    return {
        "same": not again.differences,
        "same_bytes": again.same_bytes,
        "differences": again.differences,
    }


def handover_result(done: Handover) -> dict[str, Any]:
    """What was packed, with the digest that the recipient should be told."""
    return {
        "bundle": str(done.bundle),
        "sha256": done.sha256,
        "members": done.members,
        "data": done.data,
        "rows": done.rows,
        "share_safe": done.share_safe,
        "cautions": done.cautions,
    }


def received_result(done: Received) -> dict[str, Any]:
    """What was received, and whether its record came out again."""
    return {
        "folder": str(done.folder),
        "program": done.program,
        "plan": done.plan,
        "members": done.members,
        "chains": done.chains,
        "lock": done.lock,
        "safe": done.safe,
        "replay": None if done.replay is None else replay_result(done.replay),
        "aside": done.aside,
        "not_replayed": done.not_replayed,
        "own_lock": done.own_lock,
    }

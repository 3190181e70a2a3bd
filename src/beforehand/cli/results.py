"""What ``--json`` prints: the keys of each command's result, in one place because they are a promise."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from beforehand.api import Replay
    from beforehand.lock import Lock
    from beforehand.plan import Plan
    from beforehand.review import Review


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


def run_result(lock: Lock, record: str) -> dict[str, Any]:
    """The answer of a run and what left; everything else is in the record."""
    return {
        "status": lock.status,
        "record": record,
        "digest": lock.digest,
        "plan": {"file": lock.plan.file, "decisions": lock.plan.decisions, "whole": lock.plan.whole},
        "data": lock.data,
        "answer": lock.answer,
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


def replay_result(again: Replay) -> dict[str, Any]:
    """Whether a record came out the same, and every difference with its place."""
    return {
        "same": not again.differences,
        "same_bytes": again.same_bytes,
        "differences": again.differences,
    }

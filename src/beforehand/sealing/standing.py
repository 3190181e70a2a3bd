"""How a plan stands to its seals: sealed, amended, deviating, or never sealed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from beforehand.comparing import Change, plan_changes
from beforehand.lock import SealRecord
from beforehand.lock.models import SealChange
from beforehand.plan import Plan, decisions_digest
from beforehand.sealing.looks import Look
from beforehand.sealing.seals import Seal


@dataclass(frozen=True, slots=True, kw_only=True)
class Standing:
    """What a run and its lock say about the plan's seal.

    Attributes
    ----------
    record : SealRecord
    sealed : Plan or None
        The plan as first sealed, where an amended run must stand beside it.
    """

    record: SealRecord
    sealed: Plan | None


def standing_of(plan: Plan, seals: Sequence[Seal], looks: Sequence[Look]) -> Standing:
    """How a plan stands.

    Parameters
    ----------
    plan : Plan
        As it is about to be run.
    seals : sequence of Seal
        Its chain, checked.
    looks : sequence of Look
        Runs so far, checked; runs on another outcome do not count.

    Returns
    -------
    Standing
        ``sealed`` when no decision differs from the last seal and none was amended; ``amended`` when
        none differs from the last seal and that one, or one before, amends; ``deviates`` when one
        differs. Changes of words alone break no seal and are listed.
    """
    if not seals:
        return Standing(record=SealRecord(state="unsealed", changes=()), sealed=None)
    first, last = seals[0].plan(), seals[-1]
    changes = tuple(_recorded(change) for change in plan_changes(first, plan))
    if decisions_digest(plan) != last.decisions:
        state = "deviates"
    elif any(seal.decisions != seals[0].decisions for seal in seals):
        state = "amended"
    else:
        state = "sealed"
    met = [look for look in looks if look.outcome == plan.outcome.column]
    early = not met or met[0].seal is not None
    return Standing(
        record=SealRecord.model_validate(
            {"state": state, "seals": len(seals), "before_first_look": early, "changes": changes}
        ),
        sealed=first if state == "amended" else None,
    )


def _recorded(change: Change) -> SealChange:
    return SealChange.model_validate({"clause": change.clause, "class": change.grade, "says": change.says})

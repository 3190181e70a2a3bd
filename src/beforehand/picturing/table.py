"""All pictures by their names, in the order in which a reader meets them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from beforehand.lock import Lock
from beforehand.picturing.coefficients import coefficients
from beforehand.picturing.columns import columns
from beforehand.picturing.contributions import contributions
from beforehand.picturing.correlations import correlations
from beforehand.picturing.moved import moved
from beforehand.picturing.picture import Picture
from beforehand.picturing.pull import pull
from beforehand.picturing.rehearsed import inclusion, models
from beforehand.picturing.residuals import normal, spread
from beforehand.picturing.straight import straight
from beforehand.picturing.trail import trail
from beforehand.refreshing import Refreshed
from beforehand.rehearsing.models import RehearsalRecord

# A new picture is one module and one line here.
OF_A_LOCK: Mapping[str, Callable[[Lock], Picture | None]] = {
    "trail": trail,
    "coefficients": coefficients,
    "contributions": contributions,
    "straight": straight,
    "spread": spread,
    "normal": normal,
    "pull": pull,
    "columns": columns,
    "correlations": correlations,
}

OF_A_REHEARSAL: Mapping[str, Callable[[RehearsalRecord, Lock | None], Picture | None]] = {
    "inclusion": inclusion,
    "models": models,
}


def pictures_of(
    lock: Lock,
    *,
    rehearsal: RehearsalRecord | None = None,
    refresh: Refreshed | Mapping[str, Any] | None = None,
) -> Mapping[str, Picture]:
    """Every picture that there is something to show in, by name.

    Parameters
    ----------
    lock : Lock
        One without ``pictures``, of an earlier version, has fewer.
    rehearsal : RehearsalRecord, optional
    refresh : Refreshed or mapping, optional
        A refresh, or its record as read from its file.
    """
    found: dict[str, Picture | None] = {name: make(lock) for name, make in OF_A_LOCK.items()}
    if rehearsal is not None:
        found |= {name: make(rehearsal, lock) for name, make in OF_A_REHEARSAL.items()}
    if refresh is not None:
        found["moved"] = moved(refresh, shift_limit(lock))
    return {name: picture for name, picture in found.items() if picture is not None}


def shift_limit(lock: Lock) -> float | None:
    """The plan's limit of a coefficient's shift in a refresh, in old standard errors."""
    block = lock.plan.written.get("refresh")
    limit = block.get("coefficient") if isinstance(block, Mapping) else None
    return float(limit) if isinstance(limit, int | float) else None

"""A plan on a refreshed table: what changed, and whether the answer still holds."""

from __future__ import annotations

from beforehand.refreshing.record import (
    MovedCoefficient,
    Refreshed,
    as_mapping,
    refresh_text,
    refreshed,
    unkept,
)

__all__ = [
    "MovedCoefficient",
    "Refreshed",
    "as_mapping",
    "refresh_text",
    "refreshed",
    "unkept",
]

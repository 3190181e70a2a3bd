"""From a run to its lock: only what steps returned and benches kept goes in, and all of it does."""

from __future__ import annotations

from beforehand.record.whole import UNSEALED, learned_from, learned_in, lock_of

__all__ = ["UNSEALED", "learned_from", "learned_in", "lock_of"]

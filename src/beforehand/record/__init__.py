"""From a run to its lock: only what steps returned and benches kept goes in, and all of it does."""

from __future__ import annotations

from beforehand.record.whole import lock_of

__all__ = ["lock_of"]

"""How far the work is and how long the rest will take; the only place of a rehearsal with a clock."""

from __future__ import annotations

import time
from collections.abc import Callable

_MINUTE, _HOUR = 60.0, 3600.0


class Pace:
    """Counts replicates and tells of them.

    Parameters
    ----------
    name : str
        Of the world.
    of : int
        Replicates in all.
    before : int
        Those that were finished in an earlier session, and say nothing of the speed of this one.
    progress : callable or None
    """

    def __init__(self, name: str, of: int, before: int, progress: Callable[[str], None] | None) -> None:
        self._name, self._of, self._before, self._done = name, of, before, before
        self._progress = progress
        self._started = time.monotonic()

    def advance(self, count: int) -> None:
        """So many more are finished."""
        self._done += count
        self.tell()

    def tell(self) -> None:
        """Say how far it is."""
        if self._progress is None:
            return
        text = f"{self._name}: {self._done:,} of {self._of:,}"
        now, rest = self._done - self._before, self._of - self._done
        if now and rest:
            text += f", {left(rest * (time.monotonic() - self._started) / now)} left"
        self._progress(text)


def left(seconds: float) -> str:
    """A time in the unit that a person would use, rounded up."""
    if seconds <= 1.5 * _MINUTE:
        return f"{max(1, _up(seconds))} s"
    if seconds <= 1.5 * _HOUR:
        return f"{_up(seconds / _MINUTE)} min"
    return f"{_up(seconds / _HOUR)} h"


def _up(number: float) -> int:
    """Rounded up."""
    return -int(-number // 1)

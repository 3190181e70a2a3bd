"""What is common to measuring one side beside another."""

from __future__ import annotations

import contextlib
import resource
import statistics
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One measured ratio beside its goal, of ours to the other or of the other to ours.

    Attributes
    ----------
    what, ours, other : str
    ratio : float
    goal : float or None
        None where there is none.
    at_most : bool
        Whether the goal is an upper limit.
    """

    what: str
    ours: str
    other: str
    ratio: float
    goal: float | None = None
    at_most: bool = False

    def told(self) -> str:
        """The line as it is printed."""
        met = goal = ""
        if self.goal is not None:
            goal = f"{'≤' if self.at_most else '≥'} {self.goal:g}"
            met = "met" if (self.ratio <= self.goal) is self.at_most or self.ratio == self.goal else "not met"
        return f"{self.what:70}{self.ours:>12}{self.other:>12}{self.ratio:>9.2f}{goal:>8}  {met}".rstrip()


def both(
    ours: Callable[[], Any], our_count: int, other: Callable[[], Any], other_count: int, repeats: int
) -> tuple[float, float]:
    """Median seconds a replicate of two sides, run in turn so that a busy moment touches both."""
    pairs = [(timed(ours), timed(other)) for _ in range(repeats)]
    return (
        statistics.median(one for one, _ in pairs) / our_count,
        statistics.median(two for _, two in pairs) / other_count,
    )


def median_time(work: Callable[[], Any], repeats: int) -> float:
    """Median seconds of work."""
    return statistics.median(timed(work) for _ in range(repeats))


def timed(work: Callable[[], Any], clock: Callable[[], float] = time.process_time) -> float:
    """Seconds of work; of this process's own, where nothing else is said, whatever else the machine does."""
    start = clock()
    work()
    return clock() - start


def ms(seconds: float) -> str:
    """Seconds as milliseconds."""
    return f"{seconds * 1e3:,.3f}"


def mib(size: float) -> str:
    """Bytes as MiB."""
    return f"{size / 2**20:,.1f} MiB"


def peak() -> int:
    """Largest resident size of this process so far, in bytes."""
    with contextlib.suppress(OSError):
        # On Linux ru_maxrss starts from what the process that started this one has held.
        for line in Path("/proc/self/status").read_text(encoding="ascii").splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) * 1024
    # It counts kibibytes on Linux and bytes on macOS.
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * (1 if sys.platform == "darwin" else 1024)

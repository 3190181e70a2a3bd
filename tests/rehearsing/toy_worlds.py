"""A world that other processes can import: least squares on noise, quick and with last digits to lose."""

from __future__ import annotations

import os
import signal
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.trials import Subjects, Trials, empty

SUBJECTS = Subjects(names=("a", "b"), held=(False, True), columns=("a", "b"), owners=(0, 1))
ROWS = 400


@dataclass(frozen=True)
class Toy:
    """``pause`` seconds a block; ends its process once at ``last_words``, a replicate, with ``folder``."""

    name: str = "toy"
    seed: int = 7
    pause: float = 0.0
    last_words: int | None = None
    folder: str = ""
    interrupt_at: int | None = None

    def trials(self, first: int, last: int) -> Trials:
        """Two slopes and an R² of noise on noise."""
        time.sleep(self.pause)
        if self.interrupt_at is not None and first >= self.interrupt_at:
            raise KeyboardInterrupt
        if self.last_words is not None and first <= self.last_words < last:
            os.kill(os.getpid(), signal.SIGKILL)
        if self.folder:
            Path(self.folder, f"{first}-{os.getpid()}").touch()
        found = empty(last - first, SUBJECTS)
        for place, replicate in enumerate(range(first, last)):
            rng = generator(self.seed, "noise", replicate)
            design, outcome = rng.standard_normal((ROWS, 2)), rng.standard_normal(ROWS)
            slopes = np.linalg.solve(design.T @ design, design.T @ outcome)
            found.estimates[place] = slopes
            found.adopted[place] = np.abs(slopes) > 0.05
            found.r_squared[place] = 1.0 - np.var(outcome - design @ slopes) / np.var(outcome)
            found.rows[place] = ROWS
            found.status[place] = replicate % 3
        return found

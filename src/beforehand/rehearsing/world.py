"""What a scenario is to the machinery that runs it: a maker of trials, replicate by replicate."""

from __future__ import annotations

from typing import Protocol

from beforehand.rehearsing.trials import Trials


class World(Protocol):
    """One part of a scenario, which can be sent to another process whole."""

    @property
    def name(self) -> str:
        """Its name, unique within a rehearsal, such as ``noise``."""
        ...

    def trials(self, first: int, last: int) -> Trials:
        """What the plan comes to in replicates ``first`` to ``last`` (exclusive).

        The same for a replicate whatever block it is asked for in.
        """
        ...

"""Blocks of replicates: the unit of work, which is the same whoever does it."""

from __future__ import annotations

import threading
from functools import cache
from typing import TYPE_CHECKING

from beforehand.rehearsing.trials import Trials
from beforehand.rehearsing.world import World

if TYPE_CHECKING:
    from threadpoolctl import ThreadpoolController

Block = tuple[int, int]
Finished = tuple[Block, Trials]

# Large enough that sending a block costs little beside it, small enough that little is lost with one.
BLOCK = 50

# The limit on threads holds for a whole process, so that its blocks are computed one after another.
_ONE_AT_A_TIME = threading.Lock()


def blocks_of(replicates: int, size: int = BLOCK) -> tuple[Block, ...]:
    """First and last replicate (exclusive) of each block."""
    return tuple((first, min(first + size, replicates)) for first in range(0, replicates, size))


def block_trials(world: World, block: Block) -> Trials:
    """The trials of one block, computed on one thread.

    Libraries for matrices add up in another order on several threads, which would change last digits.
    """
    with _ONE_AT_A_TIME, _libraries().limit(limits=1):
        return world.trials(*block)


@cache
def _libraries() -> ThreadpoolController:
    """The libraries of this process that have threads; looking for them takes longer than a small block."""
    # What multiplies and factors matrices is loaded first, so that it is found.
    import scipy.linalg
    from threadpoolctl import ThreadpoolController

    assert scipy.linalg
    return ThreadpoolController()

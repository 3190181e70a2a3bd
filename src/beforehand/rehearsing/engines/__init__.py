"""Running a world: blocks of replicates, wherever they are computed, joined in their order.

Blocks are of one size whoever computes them, each replicate has random numbers of its own, and each
block is computed on one thread, so that the trials have the same bytes for any number of workers.
"""

from __future__ import annotations

from collections.abc import Callable, Generator, Sequence
from contextlib import closing
from dataclasses import dataclass
from typing import Literal

from beforehand.rehearsing.engines.blocks import BLOCK, Block, Finished, blocks_of
from beforehand.rehearsing.engines.local import WorkerLostError, local_results
from beforehand.rehearsing.engines.pace import Pace
from beforehand.rehearsing.engines.saving import Saved, rehearsal_key
from beforehand.rehearsing.trials import Trials, joined
from beforehand.rehearsing.world import World

__all__ = ["BLOCK", "Engine", "Interrupted", "Saved", "WorkerLostError", "rehearsal_key", "run_world"]

Progress = Callable[[str], None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Engine:
    """Who computes.

    Attributes
    ----------
    kind : {"local", "dask"}
        This machine, or a Dask cluster that is there already.
    workers : int
        Processes on this machine; 1 computes in this one.
    scheduler : str or None
        Address of the cluster's scheduler, ``tcp://host:8786``.
    """

    kind: Literal["local", "dask"] = "local"
    workers: int = 1
    scheduler: str | None = None


ONE_WORKER = Engine()


class Interrupted(KeyboardInterrupt):
    """The work was interrupted from the keyboard; what was finished is in the part file, if there is one.

    It is still an interrupt: whoever does not expect it ends as after any other.

    Attributes
    ----------
    world : str
    done, of : int
        Replicates that are finished, and those that were asked for.
    trials : Trials or None
        The finished ones from the first on without a gap, which may be fewer than ``done``.
    """

    def __init__(self, world: str, done: int, of: int, trials: Trials | None) -> None:
        self.world, self.done, self.of, self.trials = world, done, of, trials
        super().__init__(f"{world}: interrupted with {done:,} of {of:,} replicates done")


def run_world(
    world: World,
    replicates: int,
    *,
    engine: Engine = ONE_WORKER,
    progress: Progress | None = None,
    saved: Saved | None = None,
    block: int = BLOCK,
) -> Trials:
    """What a plan comes to in every replicate of a world.

    Parameters
    ----------
    world : World
    replicates : int
        At least 1.
    engine : Engine
    progress : callable or None
        Hears how many replicates are done and how long the rest will take.
    saved : Saved or None
        Holds blocks that were finished before, and takes those that are finished now.
    block : int
        Replicates that are computed together.

    Returns
    -------
    Trials
        Of ``replicates`` replicates, the same bytes whoever computed them.

    Raises
    ------
    Interrupted
        On an interrupt from the keyboard.
    InputError
        When the scheduler of the cluster does not answer, or its workers cannot do the work.
    WorkerLostError
        When workers are lost again and again.
    """
    blocks = blocks_of(replicates, block)
    before = saved.blocks(world.name) if saved is not None else {}
    done = {one: before[one] for one in blocks if one in before}
    todo = tuple(one for one in blocks if one not in done)
    pace = Pace(world.name, replicates, sum(map(_size, done)), progress)
    try:
        pace.tell()
        if todo:
            with closing(_results(engine, world, todo)) as results:
                for one, trials in results:
                    done[one] = trials
                    if saved is not None:
                        saved.keep(world.name, one, trials)
                    pace.advance(_size(one))
    except KeyboardInterrupt:
        raise Interrupted(world.name, sum(map(_size, done)), replicates, _without_gap(blocks, done)) from None
    return joined([done[one] for one in blocks])


def _size(block: Block) -> int:
    """Replicates of a block."""
    return block[1] - block[0]


def _without_gap(blocks: Sequence[Block], done: dict[Block, Trials]) -> Trials | None:
    """Finished blocks as far as they follow each other from the first."""
    parts = []
    for one in blocks:
        if one not in done:
            break
        parts.append(done[one])
    return joined(parts) if parts else None


def _results(engine: Engine, world: World, blocks: Sequence[Block]) -> Generator[Finished, None, None]:
    """Blocks with their trials as they are finished."""
    if engine.kind == "dask":
        from beforehand.rehearsing.engines.cluster import cluster_results

        return cluster_results(world, blocks, engine.scheduler)
    return local_results(world, blocks, engine.workers)

"""Blocks on this machine: in this process, or in several."""

from __future__ import annotations

import signal
import threading
import warnings
from collections.abc import Generator, Iterator, Sequence
from contextlib import contextmanager

from beforehand.faults import BeforehandError
from beforehand.rehearsing.engines.blocks import Block, Finished, block_trials
from beforehand.rehearsing.world import World


class WorkerLostError(BeforehandError):
    """A process that computed blocks ended from outside, most often for want of memory."""

    code = "worker_lost"


def local_results(world: World, blocks: Sequence[Block], workers: int) -> Generator[Finished, None, None]:
    """Blocks with their trials, as they are finished.

    Parameters
    ----------
    world : World
    blocks : sequence of Block
    workers : int
        Processes; with one, or one block, everything is computed here.

    Raises
    ------
    WorkerLostError
        When a process was ended from outside.
    """
    if workers <= 1 or len(blocks) <= 1:
        for block in blocks:
            yield block, block_trials(world, block)
        return
    from joblib import Parallel, delayed
    from joblib.externals.loky.process_executor import TerminatedWorkerError

    pool = Parallel(n_jobs=min(workers, len(blocks)), backend="loky", return_as="generator_unordered")
    results: Generator[Finished, None, None] = pool(delayed(_in_worker)(world, block) for block in blocks)
    try:
        while True:
            with _without_advice():
                found = next(results, None)
            if found is None:
                return
            yield found
    except TerminatedWorkerError:
        what = (
            "a worker process was ended from outside, perhaps for want of memory; what was finished is kept: "
            "go on with --resume and fewer workers"
        )
        raise WorkerLostError(what) from None
    finally:
        with _without_advice():
            results.close()


@contextmanager
def _without_advice() -> Iterator[None]:
    """Without the advice to use all results, which whoever interrupts the work does not need."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message=".*tasks", category=UserWarning)
        yield


def _in_worker(world: World, block: Block) -> Finished:
    """A block in a process of its own, which leaves an interrupt from the keyboard to the first one."""
    if threading.current_thread() is threading.main_thread():
        signal.signal(signal.SIGINT, signal.SIG_IGN)
    return block, block_trials(world, block)

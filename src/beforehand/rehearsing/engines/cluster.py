"""Blocks on a Dask cluster that is there already.

The world is sent to the workers once. A worker that is lost costs the blocks it was computing, which go
to another one; when the world itself was lost with it, it is sent again.
"""

from __future__ import annotations

from collections.abc import Generator, Sequence
from contextlib import suppress
from typing import Any

from beforehand.faults import Fault, InputError
from beforehand.rehearsing.engines.blocks import Block, Finished, block_trials
from beforehand.rehearsing.engines.local import WorkerLostError
from beforehand.rehearsing.trials import Trials
from beforehand.rehearsing.world import World
from beforehand.version import __version__

# A scheduler that is there answers at once, also over a slow line.
PATIENCE = 10.0

# A block that takes a worker down with it each time is not tried for ever.
RETRIES = 5

# Blocks at a time for each thread of the cluster: enough that none of them waits for work.
WAITING_EACH = 2


def cluster_results(
    world: World, blocks: Sequence[Block], scheduler: str | None
) -> Generator[Finished, None, None]:
    """Blocks with their trials, as they are finished.

    Parameters
    ----------
    world : World
    blocks : sequence of Block
    scheduler : str or None
        Address, ``tcp://host:8786``.

    Raises
    ------
    InputError
        When the scheduler does not answer, has no workers, or they have another version of this program.
    WorkerLostError
        When workers are lost again and again.
    """
    client = _client(scheduler)
    try:
        _require_same_program(client, str(scheduler))
        todo = list(blocks)
        for _ in range(RETRIES + 1):
            for block, trials in _round(client, world, tuple(todo)):
                todo.remove(block)
                yield block, trials
            if not todo:
                return
        what = (
            f"the cluster at {scheduler} loses its workers again and again; what was finished is kept: "
            "go on with --resume"
        )
        raise WorkerLostError(what)
    finally:
        with suppress(OSError, TimeoutError):
            client.close(timeout=PATIENCE)


def _round(client: Any, world: World, blocks: Sequence[Block]) -> Generator[Finished, None, None]:
    """Everything that can be computed while the world stays where it was sent."""
    from distributed import as_completed
    from distributed.scheduler import KilledWorker

    _wait_for_workers(client)
    (sent,) = client.scatter([world], broadcast=True, hash=False)
    at_once = max(1, WAITING_EACH * sum(client.nthreads().values()))
    waiting = iter(blocks)

    def submit(block: Block) -> Any:
        return client.submit(block_trials, sent, block, pure=False, retries=1)

    futures = {submit(block): block for block, _ in zip(waiting, range(at_once), strict=False)}
    finished = as_completed(list(futures), loop=client.loop)
    try:
        for future in finished:
            block = futures.pop(future)
            if future.status == "error" and not isinstance(future.exception(), KilledWorker):
                future.result()
            if future.status != "finished":
                # The world was lost with the workers that held it.
                return
            trials = _gathered(future)
            if trials is None:
                return
            yield block, trials
            for following, _ in zip(waiting, range(1), strict=False):
                future = submit(following)
                futures[future] = following
                finished.add(future)
    finally:
        with suppress(OSError, TimeoutError):
            client.cancel(list(futures))


def _gathered(future: Any) -> Trials | None:
    """The trials of a finished block; None where they were lost before they came here."""
    from concurrent.futures import CancelledError

    from distributed.scheduler import KilledWorker

    try:
        trials: Trials = future.result(timeout=None)
    except (CancelledError, KilledWorker):
        return None
    return trials


def _client(scheduler: str | None) -> Any:
    """A client of the cluster."""
    try:
        from distributed import Client
    except ImportError:
        what = "needs the package distributed: pip install 'beforehand[cluster]'"
        raise InputError([_fault("--engine dask", what, "no_distributed")]) from None
    if not scheduler:
        what = "needs the address of a scheduler: --scheduler tcp://host:8786"
        raise InputError([_fault("--engine dask", what, "no_scheduler")])
    try:
        return Client(scheduler, timeout=PATIENCE, set_as_default=False)
    except (OSError, TimeoutError):
        what = f"no scheduler answered within {PATIENCE:g} seconds"
    except (ValueError, TypeError, ImportError):
        what = "is not the address of a scheduler, such as tcp://host:8786"
    except Exception:
        # Another kind of server: what it says is read as anything, a size beyond all memory among them.
        what = "something answers there that is not the scheduler of a Dask cluster"
    raise InputError([_fault(scheduler, what, "scheduler")])


def _wait_for_workers(client: Any) -> None:
    """At least one worker, also after all were lost and are begun again."""
    try:
        client.wait_for_workers(1, timeout=PATIENCE)
    except TimeoutError:
        what = f"the scheduler has had no worker for {PATIENCE:g} seconds"
        raise InputError([_fault(str(client.scheduler.address), what, "no_workers")]) from None


def _require_same_program(client: Any, scheduler: str) -> None:
    """The workers have this version of this program, or a fault."""

    # Sent by value, as it is defined here, so that it runs where this program is not installed.
    def version() -> str | None:
        try:
            from beforehand.version import __version__ as found
        except ImportError:
            return None
        return found

    _wait_for_workers(client)
    versions = set(client.run(version).values())
    if versions != {__version__}:
        others = ", ".join(sorted("none" if one is None else one for one in versions))
        what = f"its workers have beforehand {others}; they must have {__version__} as this one does"
        raise InputError([_fault(scheduler, what, "other_program")])


def _fault(file: str, what: str, code: str) -> Fault:
    return Fault(file=file, line=None, place="", what=what, code=code)

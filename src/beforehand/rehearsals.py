"""Rehearsing a plan from its files: what the public functions about rehearsals do."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from beforehand.faults import LockError
from beforehand.lock import Lock, read_lock
from beforehand.lock.difference import Replay, replay_of
from beforehand.names import beside
from beforehand.plan import Plan, decisions_digest, read_plan
from beforehand.rehearsing.engines import ONE_WORKER, Engine
from beforehand.rehearsing.engines.saving import SUFFIX
from beforehand.rehearsing.models import RehearsalRecord, Scenarios, ScrambledRun
from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.reading import read_rehearsal
from beforehand.rehearsing.real import observed_of
from beforehand.rehearsing.scramble import marked, scrambled_table
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.text import with_digest
from beforehand.rehearsing.whole import Asked, choice, rehearsed
from beforehand.running import Progress, run_steps
from beforehand.runs import UNSEALED_STANDING, lock_path, looked_run, plan_path, reader, run_plan
from beforehand.sealing.chain import refused
from beforehand.table import Table

if TYPE_CHECKING:
    import pandas as pd

SCRAMBLED_SUFFIX = ".scrambled.lock.yaml"

# For a plan without a table the expected world needs some number of rows to be tried at.
ROWS_WITHOUT_TABLE = (50, 100, 200, 400)

# Scenarios that look at what the outcome goes with.
LOOKING = frozenset({"resample", "hold_out"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Rehearsal:
    """A finished rehearsal.

    Attributes
    ----------
    record : RehearsalRecord
        Digest included; see ``write_rehearsal``.
    scrambled : Lock or None
        The lock of the dry run, where one was asked for; it is not written.
    looked : bool
        Whether the rehearsal was a first look at the outcome, and stands in the register.
    """

    record: RehearsalRecord
    scrambled: Lock | None = None
    looked: bool = False


def rehearse(
    plan: Plan | str | os.PathLike[str],
    data: str | os.PathLike[str] | pd.DataFrame | None = None,
    *,
    scenarios: tuple[str, ...] = (),
    replicates: int | None = None,
    seed: int | None = None,
    rows: tuple[int, ...] = (),
    engine: Engine = ONE_WORKER,
    resume: bool = False,
    keep: bool = False,
    progress: Progress | None = None,
) -> Rehearsal:
    """Rehearse a plan: what it does to noise, to the expected effects and to other samples.

    Parameters
    ----------
    plan : Plan or path
    data : path or pandas.DataFrame, optional
        The table; without it the file that the plan names, if it is there.
    scenarios : tuple of str
        ``scrambled``, ``noise``, ``expected``, ``resample``, ``hold_out``; without them those of the plan.
        ``resample`` and ``hold_out`` look at the outcome: before the plan has been run they are left out,
        unless they are named, and then count as a look.
    replicates, seed : int, optional
        Without them those of the plan.
    rows : tuple of int
        Numbers of rows for which the expected world is tried as well.
    engine : Engine
        Processes of this machine, or a cluster.
    resume, keep : bool
        Whether finished blocks are kept in a file beside the plan while the work goes on, and whether those
        that are there already are used.
    progress : callable, optional
        Hears what is being done.

    Returns
    -------
    Rehearsal
        Nothing is written.

    Raises
    ------
    PlanError, DataError, InputError
        With every fault; what a named scenario lacks is one.
    Interrupted
        On an interrupt from the keyboard.
    """
    plan = plan if isinstance(plan, Plan) else read_plan(plan)
    asked_seed = plan.rehearsal.seed if seed is None else seed
    chosen = scenarios or plan.rehearsal.scenarios
    table = _table(plan, data, chosen)
    lock = _lock_of(plan, table)
    written = "scenarios" in plan.rehearsal.model_fields_set
    worlds, left_out = choice(
        plan, scenarios, has_table=table is not None, has_run=lock is not None, written=written
    )
    if table is None and any(name != "expected" for name in worlds):
        table = reader(data)(plan)
    if table is None and not rows:
        rows = ROWS_WITHOUT_TABLE
    stage = None if table is None else Stage.of(plan, table)
    read = _reusing(plan, table, reader(data))
    observed, looked = _observed(plan, stage, lock, worlds, read, progress)
    dry = dry_run(plan, read, asked_seed, progress) if "scrambled" in worlds and stage else None
    asked = Asked(
        scenarios=tuple(name for name in worlds if name != "scrambled"),
        replicates=plan.rehearsal.replicates if replicates is None else replicates,
        seed=asked_seed,
        rows=tuple(dict.fromkeys(rows)),
        engine=engine,
        left_out=left_out,
        part=beside(plan_path(plan), SUFFIX) if keep or resume else None,
        resume=resume,
    )
    told = None
    if dry is not None:
        name = (
            beside(plan_path(plan), SCRAMBLED_SUFFIX).name
            if plan.origin is not None
            else "scrambled.lock.yaml"
        )
        told = ScrambledRun(lock=name, status=dry.status, seed=asked_seed)
    record = rehearsed(plan, stage, asked, observed=observed, scrambled=told, progress=progress)
    return Rehearsal(record=record, scrambled=dry, looked=looked)


def with_earlier(new: RehearsalRecord, path: Path) -> tuple[RehearsalRecord, tuple[str, ...]]:
    """A record with the scenarios of an earlier one that it does not have itself.

    Parameters
    ----------
    new : RehearsalRecord
    path : Path
        Where the earlier one may stand.

    Returns
    -------
    tuple of RehearsalRecord and names
        The second names scenarios that are lost, as the earlier ones were of another plan, table, seed or
        number of replicates.
    """
    try:
        old = read_rehearsal(path)
    except LockError:
        return new, ()
    names = [
        name
        for name in Scenarios.model_fields
        if getattr(old.scenarios, name) is not None and getattr(new.scenarios, name) is None
    ]
    same = (old.plan.decisions, old.data, old.seed, old.replicates) == (
        new.plan.decisions, new.data, new.seed, new.replicates,
    )  # fmt: skip
    if not same:
        return new, tuple(names)
    made = new.scenarios.model_copy(update={name: getattr(old.scenarios, name) for name in names})
    why = tuple(said for said in new.not_rehearsed if said.partition(":")[0] not in names)
    lock = new.lock or old.lock
    return with_digest(new.model_copy(update={"scenarios": made, "not_rehearsed": why, "lock": lock})), ()


def rehearse_again(
    path: str | os.PathLike[str],
    plan: str | os.PathLike[str] | None = None,
    data: str | os.PathLike[str] | None = None,
    *,
    engine: Engine = ONE_WORKER,
    progress: Progress | None = None,
) -> Replay:
    """Compute a rehearsal again and say which figure, if any, comes out differently.

    Parameters
    ----------
    path : path
        The record.
    plan : path, optional
        Without it the plan of that name beside the record.
    data : path, optional
        Without it the table that the plan names.
    engine : Engine
    progress : callable, optional

    Raises
    ------
    LockError
        The record is not whole, or is of another plan or table.
    PlanError, DataError
    """
    old = read_rehearsal(path)
    again = read_plan(Path(path).with_name(old.plan.file) if plan is None else plan)
    if decisions_digest(again) != old.plan.decisions:
        what = f"is of a plan that decided otherwise than {old.plan.file} does now: rehearse it anew"
        raise refused(str(path), what, "rehearsal.plan")
    made = old.scenarios
    names = tuple(name for name in Scenarios.model_fields if getattr(made, name) is not None)
    at_hand = old.data is not None
    table = _table(again, data, names) if at_hand or data is not None else None
    if table is not None and old.data is not None and table.fingerprint != old.data.fingerprint:
        raise refused(str(path), f"is of another table than {table.file}", "rehearsal.data")
    by_rows = () if made.expected is None else made.expected.by_rows
    stage = None if table is None else Stage.of(again, table)
    observed: Observed | None = None
    if old.lock is not None and stage is not None:
        observed = observed_of(run_steps(again, stage.setting.table, progress), stage.subjects, old.lock)
    asked = Asked(
        scenarios=tuple(name for name in names if name != "scrambled"),
        replicates=old.replicates,
        seed=old.seed,
        # The first is the table itself, where there is one.
        rows=tuple(one.rows for one in by_rows)[int(at_hand) :],
        engine=engine,
        left_out=old.not_rehearsed,
    )
    told = made.scrambled
    if told is not None and table is not None:
        dry = dry_run(again, _reusing(again, table, reader(data)), told.seed, progress)
        told = told.model_copy(update={"status": dry.status})
    new = rehearsed(again, stage, asked, observed=observed, scrambled=told, progress=progress)
    return replay_of(old, new)


def is_rehearsal(path: str | os.PathLike[str]) -> bool:
    """Whether a file looks like the record of a rehearsal."""
    try:
        with open(path, "rb") as file:
            return b"\nrehearsal: " in file.read(4096)
    except OSError:
        return False


def _table(
    plan: Plan, data: str | os.PathLike[str] | pd.DataFrame | None, names: tuple[str, ...]
) -> Table | None:
    """The table; None where only expected effects are asked for and the plan's file is not there yet."""
    if data is None and plan.origin is not None and plan.origin.path is not None:
        there = Path(plan.origin.path).parent / plan.data.file
        if not there.exists() and "expected" in names and plan.expects is not None:
            return None
    table = reader(data)(plan)
    # What was read is told by its own name, not by that of the table for which the plan was written.
    return replace(table, file=Path(data).name) if isinstance(data, str | os.PathLike) else table


def _lock_of(plan: Plan, table: Table | None) -> Lock | None:
    """The lock of this plan on this table, where there is one."""
    if table is None or plan.origin is None or plan.origin.path is None:
        return None
    try:
        lock = read_lock(lock_path(plan))
    except LockError:
        return None
    same = lock.plan.decisions == decisions_digest(plan) and lock.data.fingerprint == table.fingerprint
    return lock if same and lock.scrambled is None else None


def _reusing(plan: Plan, table: Table | None, read: Callable[[Plan], Table]) -> Callable[[Plan], Table]:
    """What reads a table under a plan, without reading again what is at hand."""
    return lambda changed: table if changed is plan and table is not None else read(changed)


def _observed(
    plan: Plan,
    stage: Stage | None,
    lock: Lock | None,
    worlds: tuple[str, ...],
    read: Callable[[Plan], Table],
    progress: Progress | None,
) -> tuple[Observed | None, bool]:
    """The real run, and whether making it was a look."""
    if stage is None:
        return None, False
    if lock is not None:
        trail = run_steps(plan, stage.setting.table, progress)
        return observed_of(trail, stage.subjects, lock.digest), False
    if not LOOKING.intersection(worlds):
        return None, False
    done = looked_run(plan, read, progress=progress)
    return observed_of(done.trail, stage.subjects, done.lock.digest), True


def dry_run(plan: Plan, read: Callable[[Plan], Table], seed: int, progress: Progress | None = None) -> Lock:
    """The whole run on a shuffled outcome, marked as one."""
    lock = run_plan(
        plan, lambda changed: scrambled_table(read(changed), changed, seed), progress, UNSEALED_STANDING
    ).lock
    return marked(lock, seed)

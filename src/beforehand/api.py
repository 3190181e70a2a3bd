"""The public functions: read, check, run, write, replay, compare, trace, draft.

Files, and only here and in the command line: everything below is given data and gives data back.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

from beforehand.exchange import handover, receive
from beforehand.faults import DataError
from beforehand.lock import Lock, read_lock, write_lock
from beforehand.lock.difference import Replay, replay_of
from beforehand.lock.trace import Story, trace
from beforehand.lock.writing import lock_text
from beforehand.plan import Plan, decisions_digest, plan_from_mapping, read_plan
from beforehand.predicting import Predictions, prediction_in, predictions, wanted_by
from beforehand.record import learned_from, learned_in
from beforehand.refreshing import Refreshed, refreshed, unkept
from beforehand.rehearsals import Rehearsal, dry_run, is_rehearsal, rehearse, rehearse_again
from beforehand.rehearsing.engines import Engine
from beforehand.rehearsing.reading import read_rehearsal
from beforehand.rehearsing.text import write_rehearsal
from beforehand.running import Progress, run_steps
from beforehand.runs import (
    Run,
    labels_of,
    lock_path,
    looked_run,
    plan_of,
    reader,
    run_plan,
)
from beforehand.sealing import Seal, Standing, seal_plan
from beforehand.sealing.chain import refused
from beforehand.steps.learned import NOTHING, Learned
from beforehand.table import read_table
from beforehand.table.fresh import fresh_from_frame, read_fresh

if TYPE_CHECKING:
    import pandas as pd

    from beforehand.comparing import Comparison
    from beforehand.review import Review

Data = "str | os.PathLike[str] | pd.DataFrame | None"


def run(
    plan: Plan | str | os.PathLike[str],
    data: str | os.PathLike[str] | pd.DataFrame | None = None,
    *,
    progress: Progress | None = None,
    register: bool = True,
    learned: Learned = NOTHING,
) -> Run:
    """Run a plan and its declared alternatives on a table.

    A plan that was read from a file has a register of looks beside it, and each run adds a line to it.
    An amended plan is run as it was first sealed too, and the lock holds both answers.

    Parameters
    ----------
    plan : Plan or path
    data : path or pandas.DataFrame, optional
        The table; without it the file that the plan names.
    progress : callable, optional
        Hears what is being done, a few words at a time.
    register : bool
        Whether the run is a look: False for one whose result nobody sees.
    learned : Learned
        Fills and exponents of an earlier run that are used again; they stand in the lock.

    Returns
    -------
    Run
        The lock is not written; see ``write_lock``.

    Raises
    ------
    PlanError, DataError
        With every fault of the plan or the table.
    LockError
        The chain of seals or looks beside the plan is broken.
    WriteError
        The register of looks cannot be written.

    Examples
    --------
    >>> import pandas as pd
    >>> table = pd.DataFrame({"x": [1.0, 2.0, 3.0, 4.0, 5.0, 6.0], "y": [1.1, 2.0, 2.7, 4.2, 5.1, 5.8]})
    >>> from beforehand import plan_from_mapping
    >>> plan = plan_from_mapping({
    ...     "language": 1, "title": "Six readings", "question": "Does y go with x?",
    ...     "data": {"file": "readings.csv"}, "outcome": {"column": "y"},
    ...     "predictors": [{"column": "x"}],
    ... })
    >>> run(plan, table).status
    'adopted'
    """
    return looked_run(
        plan if isinstance(plan, Plan) else read_plan(plan),
        data,
        progress=progress,
        register=register,
        learned=learned,
    )


def check(plan: Plan | str | os.PathLike[str], data: str | os.PathLike[str] | None = None) -> Review:
    """Check a plan, and the table against it; the outcome is only counted.

    Raises
    ------
    PlanError, DataError
        With every fault of the plan or the table.
    """
    from beforehand.review import review

    plan = plan if isinstance(plan, Plan) else read_plan(plan)
    return review(plan, reader(data)(plan))


def draft(table_path: str | os.PathLike[str], outcome: str, *, separator: str | None = None) -> str:
    """A commented plan from a table's columns; the outcome's values are not looked at.

    Raises
    ------
    DataError
        When the table cannot be read or has no such column.
    """
    from beforehand.drafting import draft_plan
    from beforehand.table.profile import profile_file

    profiles = profile_file(table_path, outcome, separator=separator)
    return draft_plan(profiles, Path(table_path).name, outcome)


def replay(
    lock: str | os.PathLike[str],
    plan: str | os.PathLike[str] | None = None,
    data: str | os.PathLike[str] | None = None,
    *,
    progress: Progress | None = None,
) -> Replay:
    """Compute a record again and say which number or ruling, if any, comes out differently.

    Parameters
    ----------
    lock : path
        A lock, or the record of a rehearsal.
    plan : path, optional
        Without it the plan as it is written in the lock.
    data : path, optional
        Without it the file that the plan names, beside the lock.

    Raises
    ------
    LockError, PlanError, DataError
    """
    if is_rehearsal(lock):
        return rehearse_again(lock, plan, data, progress=progress)
    old = read_lock(lock)
    again = read_plan(plan) if plan is not None else plan_of(old, Path(lock))
    # How the plan stood to its seals is a fact of that day, not a result.
    first = None if old.sealed_plan is None else plan_from_mapping(old.sealed_plan.written, old.plan.file)
    read = reader(data)
    if old.scrambled is not None:
        return replay_of(old, dry_run(again, read, old.scrambled.seed, progress))
    new = run_plan(again, read, progress, Standing(record=old.seal, sealed=first), learned_in(old)).lock
    return replay_of(old, new)


def predict(lock: Lock | str | os.PathLike[str], data: str | os.PathLike[str] | pd.DataFrame) -> Predictions:
    """Predict new cases by the answer of a lock.

    Parameters
    ----------
    lock : Lock or path
    data : path or pandas.DataFrame
        The new cases, under the contract of the lock's plan; they need no outcome.

    Returns
    -------
    Predictions
        In the order of the new cases. A case that the fit has not seen the like of is no error: it
        carries the reasons.

    Raises
    ------
    LockError
        The lock has nothing that could predict: its run stopped, or an earlier version wrote it.
    DataError
        With every fault of the new table.

    Examples
    --------
    >>> import pandas as pd
    >>> table = pd.DataFrame({"x": [1.0, 2.0, 3.0, 4.0, 5.0, 6.0], "y": [1.1, 2.0, 2.7, 4.2, 5.1, 5.8]})
    >>> plan = plan_from_mapping({
    ...     "language": 1, "title": "Six readings", "question": "Does y go with x?",
    ...     "data": {"file": "readings.csv"}, "outcome": {"column": "y"},
    ...     "predictors": [{"column": "x"}],
    ... })
    >>> case, = predict(run(plan, table).lock, pd.DataFrame({"x": [8.0]})).cases
    >>> round(case.prediction, 3), case.outside[0]
    (7.893, 'x 8 is above the largest seen, 6')
    """
    name = lock.plan.file if isinstance(lock, Lock) else os.fspath(lock)
    kept = lock if isinstance(lock, Lock) else read_lock(lock)
    plan = plan_from_mapping(kept.plan.written, kept.plan.file)
    wanted = wanted_by(plan, prediction_in(kept, name))
    if isinstance(data, str | os.PathLike):
        read = read_fresh(plan, wanted, data, columns=kept.data.columns)
    else:
        read = fresh_from_frame(plan, wanted, data)
    return predictions(kept, plan, read, name=name)


def compare(
    old: str | os.PathLike[str],
    new: str | os.PathLike[str],
    data: str | os.PathLike[str] | None = None,
    *,
    progress: Progress | None = None,
) -> Comparison:
    """Say what changed between two plans or two locks, and which way each change leans.

    Parameters
    ----------
    old, new : path
        A plan or a lock; ``REVISION:path`` is read from git.
    data : path, optional
        Each plan is run on this table, which counts as a look, and the records are compared too.

    Raises
    ------
    InputError, PlanError, DataError, LockError
    """
    from beforehand.comparing import compared

    return compared(old, new, None if data is None else lambda plan: run(plan, data, progress=progress).lock)


def refresh(
    plan: str | os.PathLike[str],
    data: str | os.PathLike[str],
    *,
    against: str | os.PathLike[str] | None = None,
    old_data: str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
) -> Refreshed:
    """Run a plan on a refreshed table and hold the answer against the one before.

    The run is a look and stands in the register; neither lock nor record is written.

    Parameters
    ----------
    plan, data : path
        The plan, and the refreshed table.
    against : path, optional
        The lock of the run before; without it the one beside the plan.
    old_data : path, optional
        The table of that lock; without it the one that the plan names.
    progress : callable, optional
        Hears what is being done.

    Returns
    -------
    Refreshed

    Raises
    ------
    LockError
        There is no such lock, it is of another plan, or the old table is not the one of which it is.
    PlanError, DataError, WriteError
        As of `run`; a new level, a value out of range or a text for a number is a verdict, not an error.
    """
    planned = read_plan(plan)
    name = str(lock_path(planned) if against is None else against)
    old = read_lock(name)
    if old.scrambled is not None:
        raise refused(name, "is of a dry run on a shuffled outcome: there is no answer in it", "scrambled")
    if old.plan.decisions != decisions_digest(planned):
        what = "its plan decides otherwise than this one: compare the two plans first"
        raise refused(name, what, "refresh.plan")
    before = read_table(planned, old_data)
    if before.fingerprint != old.data.fingerprint:
        which = planned.data.file if old_data is None else str(old_data)
        what = f"{which} is not the table of which it is the record: give that one by --old"
        raise refused(name, what, "refresh.data")
    first = run_steps(planned, before, progress, learned_in(old))
    learned = learned_from(old) if planned.refresh.learned == "replay" else NOTHING
    try:
        done = run(planned, data, progress=progress, learned=learned)
    except DataError as error:
        return unkept(planned, old, error)
    return refreshed(planned, old, first, done.lock, done.trail, labels_of(planned))


def seal(
    plan: str | os.PathLike[str],
    *,
    by: str,
    seen: str,
    data: str | os.PathLike[str] | None = None,
    amend: str | None = None,
    kind: str | None = None,
    expected_effect: str | None = None,
) -> tuple[Seal, bool]:
    """Seal a plan as it is now: its digests, the time, who, and what had been seen.

    Parameters
    ----------
    plan : path
    by, seen : str
        Who seals, and what has been seen of the data: ``nothing``, ``predictors`` or ``everything``.
    data : path, optional
        Without it the table that the plan names, if it is there.
    amend : str, optional
        Why a plan that was sealed before is changed; it makes the seal an amendment.
    kind : str, optional
        Of an amendment: ``unforeseen``, ``mistake``, ``gap`` or ``assumption_failed``.
    expected_effect : str, optional
        What the amendment is expected to do to the answer.

    Returns
    -------
    tuple of Seal and bool
        The seal in force, and whether it is new.

    Raises
    ------
    InputError, PlanError, DataError, LockError
    WriteError
        The chain is as it was.
    """
    return seal_plan(
        read_plan(plan),
        Path(plan),
        by=by,
        seen=seen,
        data=None if data is None else Path(data),
        amend=amend,
        kind=kind,
        expected_effect=expected_effect,
    )


__all__ = [
    "Engine",
    "Lock",
    "Plan",
    "Predictions",
    "Rehearsal",
    "Replay",
    "Run",
    "Story",
    "check",
    "compare",
    "draft",
    "handover",
    "lock_path",
    "lock_text",
    "plan_from_mapping",
    "predict",
    "read_lock",
    "read_plan",
    "read_rehearsal",
    "receive",
    "refresh",
    "rehearse",
    "replay",
    "run",
    "seal",
    "trace",
    "write_lock",
    "write_rehearsal",
]

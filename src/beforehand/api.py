"""The public functions: read, check, run, write, replay, trace, draft.

Files, and only here and in the command line: everything below is given data and gives data back.
"""

from __future__ import annotations

import hashlib
import hmac
import os
import secrets
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from beforehand.faults import Fault, PlanError
from beforehand.lock import Lock, read_lock, write_lock
from beforehand.lock.difference import Replay, replay_of
from beforehand.lock.files import write_whole
from beforehand.lock.trace import Story, trace
from beforehand.lock.writing import lock_text, sealed_lock
from beforehand.plan import Plan, PlanOrigin, plan_from_mapping, read_plan, with_changes
from beforehand.record import lock_of
from beforehand.running import Progress, Trail, run_steps
from beforehand.table import Table, read_table, table_from_frame

if TYPE_CHECKING:
    import pandas as pd

    from beforehand.review import Review

Data = "str | os.PathLike[str] | pd.DataFrame | None"

PLAN_SUFFIX = ".plan.yaml"
LOCK_SUFFIX = ".lock.yaml"
KEY_SUFFIX = ".labels.key"

# A key of 256 bits, as long as the digest it keys.
KEY_BYTES = 32


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """A finished run.

    Attributes
    ----------
    lock : Lock
        The whole record, digest included.
    trail : Trail
        The same run as the program's own objects, the exact moments among them.
    """

    lock: Lock
    trail: Trail

    @property
    def status(self) -> str:
        """``adopted``, ``mean_only``, ``inconclusive`` or ``stopped``."""
        return self.lock.status


def run(
    plan: Plan | str | os.PathLike[str],
    data: str | os.PathLike[str] | pd.DataFrame | None = None,
    *,
    progress: Progress | None = None,
) -> Run:
    """Run a plan and its declared alternatives on a table.

    Parameters
    ----------
    plan : Plan or path
    data : path or pandas.DataFrame, optional
        The table; without it the file that the plan names.
    progress : callable, optional
        Hears what is being done, a few words at a time.

    Returns
    -------
    Run
        Nothing is written; see ``write_lock``.

    Raises
    ------
    PlanError, DataError
        With every fault of the plan or the table.

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
    plan = plan if isinstance(plan, Plan) else read_plan(plan)
    read = _reader(data)
    table = read(plan)
    trail = run_steps(plan, table, progress)
    alternatives: dict[str, Trail] = {}
    for name, changes in plan.alternatives.items():
        changed = with_changes(plan, changes)
        again = table if _same_contract(plan, changed) else read(changed)
        alternatives[name] = run_steps(changed, again, progress)
    file = Path(plan.origin.path).name if plan.origin is not None and plan.origin.path else "plan.yaml"
    lock = lock_of(trail, alternatives, file=file, labels=_labels(plan))
    return Run(lock=sealed_lock(lock), trail=trail)


def check(plan: Plan | str | os.PathLike[str], data: str | os.PathLike[str] | None = None) -> Review:
    """Check a plan, and the table against it; the outcome is only counted.

    Raises
    ------
    PlanError, DataError
        With every fault of the plan or the table.
    """
    from beforehand.review import review

    plan = plan if isinstance(plan, Plan) else read_plan(plan)
    return review(plan, _reader(data)(plan))


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
    """Compute a lock again and say which number or ruling, if any, comes out differently.

    Parameters
    ----------
    lock : path
    plan : path, optional
        Without it the plan as it is written in the lock.
    data : path, optional
        Without it the file that the plan names, beside the lock.

    Raises
    ------
    LockError, PlanError, DataError
    """
    old = read_lock(lock)
    again = read_plan(plan) if plan is not None else _plan_of(old, Path(lock))
    new = run(again, data, progress=progress).lock
    return replay_of(old, new)


def lock_path(plan: Plan) -> Path:
    """Where a plan's lock stands: beside it, under its name.

    Raises
    ------
    PlanError
        For a plan that was not read from a file.
    """
    if plan.origin is None or plan.origin.path is None:
        raise PlanError(
            [Fault(file="plan", line=None, place="", what="was not read from a file", code="no_file")]
        )
    path = Path(plan.origin.path)
    return path.with_name(path.name.removesuffix(PLAN_SUFFIX).removesuffix(".yaml") + LOCK_SUFFIX)


def _reader(data: str | os.PathLike[str] | pd.DataFrame | None) -> Callable[[Plan], Table]:
    """What reads the table under a plan's contract."""
    if data is None or isinstance(data, str | os.PathLike):
        return lambda plan: read_table(plan, data)
    return lambda plan: table_from_frame(plan, data)


def _same_contract(plan: Plan, changed: Plan) -> bool:
    """Whether two plans read the same table from the same file."""
    parts = (
        "data",
        "eligibility",
        "derive",
        "outcome",
        "predictors",
        "missing_data",
        "errors",
        "assumptions",
    )
    return all(getattr(plan, part) == getattr(changed, part) for part in parts)


def _plan_of(lock: Lock, path: Path) -> Plan:
    """The plan as it is written in a lock, in the lock's folder."""
    plan = plan_from_mapping(lock.plan.written, lock.plan.file)
    origin = PlanOrigin(path=path.with_name(lock.plan.file), name=lock.plan.file, lines={})
    return plan.with_origin(origin)


def _labels(plan: Plan) -> Callable[[str], str]:
    """What stands for a row's label in the lock: itself, or a keyed hash.

    An unkeyed hash of a guessable label can be undone by guessing, so the key is a file of its own
    beside the plan, made once and not to be handed on with the lock.
    """
    if plan.data.labels_in_lock == "shown":
        return str
    key = _label_key(plan)
    return lambda label: hmac.new(key, label.encode(), hashlib.sha256).hexdigest()[:16]


def _label_key(plan: Plan) -> bytes:
    """The key of a plan's labels, made on first use."""
    path = lock_path(plan)
    path = path.with_name(path.name.removesuffix(LOCK_SUFFIX) + KEY_SUFFIX)
    try:
        return bytes.fromhex(path.read_text(encoding="ascii").strip())
    except FileNotFoundError:
        key = secrets.token_bytes(KEY_BYTES)
        write_whole(path, (key.hex() + "\n").encode())
        return key


__all__ = [
    "Lock",
    "Plan",
    "Replay",
    "Run",
    "Story",
    "check",
    "draft",
    "lock_path",
    "lock_text",
    "plan_from_mapping",
    "read_lock",
    "read_plan",
    "replay",
    "run",
    "trace",
    "write_lock",
]

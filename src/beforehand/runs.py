"""One run of a plan, from its table to its lock: what every public function that runs goes through."""

from __future__ import annotations

import hashlib
import hmac
import os
import secrets
from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from beforehand.faults import Fault, PlanError
from beforehand.lock import Lock
from beforehand.lock.files import write_whole
from beforehand.lock.writing import sealed_lock
from beforehand.names import beside
from beforehand.plan import Plan, PlanOrigin, plan_from_mapping, with_changes
from beforehand.record import UNSEALED, lock_of
from beforehand.running import Progress, Trail, run_steps
from beforehand.sealing import (
    Look,
    Seal,
    Standing,
    add_look,
    looks_path,
    read_looks,
    read_seals,
    require_writable,
    seal_path,
    standing_of,
)
from beforehand.steps.learned import NOTHING, Learned
from beforehand.table import Table, read_table, table_from_frame

if TYPE_CHECKING:
    import pandas as pd

LOCK_SUFFIX = ".lock.yaml"
KEY_SUFFIX = ".labels.key"

UNSEALED_STANDING = Standing(record=UNSEALED, sealed=None)

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
    looks : tuple of Look
        The register of looks with this run as the last; empty where none was kept.
    """

    lock: Lock
    trail: Trail
    looks: tuple[Look, ...] = ()

    @property
    def status(self) -> str:
        """``adopted``, ``mean_only``, ``inconclusive`` or ``stopped``."""
        return self.lock.status


def run_plan(
    plan: Plan,
    data: str | os.PathLike[str] | pd.DataFrame | Callable[[Plan], Table] | None,
    progress: Progress | None,
    standing: Standing,
    learned: Learned = NOTHING,
    labels: Callable[[str], str] | None = None,
) -> Run:
    """The run itself, with how the plan stands to its seals and what is not learned anew.

    ``data`` may be what reads the table, and ``labels`` what stands for a row's label, if that is not
    as the plan says.
    """
    read = reader(data)
    table = read(plan)
    trail = run_steps(plan, table, progress, learned)
    alternatives: dict[str, Trail] = {}
    for name, changes in plan.alternatives.items():
        changed = with_changes(plan, changes)
        again = table if same_contract(plan, changed) else read(changed)
        alternatives[name] = run_steps(changed, again, progress, learned)
    sealed = None
    if standing.sealed is not None:
        first = standing.sealed if plan.origin is None else standing.sealed.with_origin(plan.origin)
        again = table if same_contract(plan, first) else read(first)
        sealed = run_steps(first, again, progress, learned)
    file = Path(plan.origin.path).name if plan.origin is not None and plan.origin.path else "plan.yaml"
    shown = labels_of(plan) if labels is None else labels
    lock = lock_of(trail, alternatives, file=file, labels=shown, seal=standing.record, sealed=sealed)
    return Run(lock=sealed_lock(lock), trail=trail)


def looked_run(
    plan: Plan,
    data: str | os.PathLike[str] | pd.DataFrame | Callable[[Plan], Table] | None,
    *,
    progress: Progress | None = None,
    register: bool = True,
    learned: Learned = NOTHING,
) -> Run:
    """A run that stands in the register of looks beside its plan, where the plan is a file.

    Raises
    ------
    PlanError, DataError, LockError, WriteError
        As of the public ``run``.
    """
    path = None if plan.origin is None or plan.origin.path is None else Path(plan.origin.path)
    standing, seals = UNSEALED_STANDING, tuple[Seal, ...]()
    if path is not None:
        seals, looks = read_seals(seal_path(path)), read_looks(looks_path(path))
        standing = standing_of(plan, seals, looks)
        if register:
            require_writable(looks_path(path))
    done = run_plan(plan, data, progress, standing, learned)
    if path is None or not register:
        return done
    looks = add_look(
        looks_path(path),
        date=datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
        outcome=plan.outcome.column,
        plan=done.lock.plan.decisions,
        data=done.lock.data.fingerprint,
        lock=done.lock.digest,
        status=done.lock.status,
        seal=seals[-1].digest if seals else None,
    )
    return replace(done, looks=looks)


def lock_path(plan: Plan) -> Path:
    """Where a plan's lock stands: beside it, under its name.

    Raises
    ------
    PlanError
        For a plan that was not read from a file.
    """
    return beside(plan_path(plan), LOCK_SUFFIX)


def plan_path(plan: Plan) -> Path:
    """A plan's own file, beside which everything else stands.

    Raises
    ------
    PlanError
        For a plan that was not read from a file.
    """
    if plan.origin is None or plan.origin.path is None:
        raise PlanError(
            [Fault(file="plan", line=None, place="", what="was not read from a file", code="no_file")]
        )
    return Path(plan.origin.path)


def reader(
    data: str | os.PathLike[str] | pd.DataFrame | Callable[[Plan], Table] | None,
) -> Callable[[Plan], Table]:
    """What reads the table under a plan's contract."""
    if callable(data):
        return data
    if data is None or isinstance(data, str | os.PathLike):
        return lambda plan: read_table(plan, data)
    return lambda plan: table_from_frame(plan, data)


def same_contract(plan: Plan, changed: Plan) -> bool:
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
    same = all(getattr(plan, part) == getattr(changed, part) for part in parts)
    return same and plan.rehearsal.leave_out == changed.rehearsal.leave_out


def plan_of(lock: Lock, path: Path) -> Plan:
    """The plan as it is written in a lock, in the lock's folder."""
    plan = plan_from_mapping(lock.plan.written, lock.plan.file)
    origin = PlanOrigin(path=path.with_name(lock.plan.file), name=lock.plan.file, lines={})
    return plan.with_origin(origin)


def labels_of(plan: Plan) -> Callable[[str], str]:
    """What stands for a row's label in the lock: itself, or a keyed hash."""
    return str if plan.data.labels_in_lock == "shown" else hashed_labels(plan)


def hashed_labels(plan: Plan) -> Callable[[str], str]:
    """The keyed hash of a label.

    An unkeyed hash of a guessable label can be undone by guessing, so the key is a file of its own
    beside the plan, made once and not to be handed on with the lock.
    """
    return keyed(_label_key(plan))


def keyed(key: bytes) -> Callable[[str], str]:
    """The hash of a label under a key."""
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

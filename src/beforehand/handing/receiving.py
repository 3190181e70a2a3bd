"""Receiving a bundle: checked, its plan and chains read, its lock computed again, then put in its place."""

from __future__ import annotations

import os
import secrets
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

from beforehand.faults import Fault, InputError
from beforehand.handing.labels import as_labelled
from beforehand.handing.manifest import MANIFEST, Manifest, Member
from beforehand.handing.opening import opened
from beforehand.handing.placing import beside_folder, place, require_free, unpack
from beforehand.handing.tables import (
    Read,
    checked_names,
    column_names,
    hashed_table,
    own_table,
    plans_read,
)
from beforehand.lock import Lock, read_lock, write_lock
from beforehand.lock.difference import Replay, replay_of
from beforehand.plan import Plan, plan_from_mapping, read_plan, whole_digest
from beforehand.record import learned_in
from beforehand.running import Progress
from beforehand.runs import KEY_BYTES, keyed, run_plan
from beforehand.sealing import Standing, beside

FINGERPRINT_ASIDE = "the table's fingerprint, which is taken over the labels themselves"
LABELS_ASIDE = "row labels and digests of them, since a hash cannot be made again without its key"
# The lock of a recipient's own table, beside the one that was received.
OWN_LOCK = ".received.lock.yaml"

COLUMNS_ASIDE = "the names of the table's own columns"


@dataclass(frozen=True, slots=True, kw_only=True)
class Received:
    """What was received.

    Attributes
    ----------
    folder : Path
    program : str
        The program that packed it, with its version.
    plan : str
        Name of the plan's file; it has been read and has no fault.
    members : mapping of str to Member
        Every file that was put there, each of the size and digest that the manifest says.
    chains : tuple of str
        Files of seals and looks, every link of which holds.
    lock, safe : str or None
        Name of the lock, or of a copy that gives no row away.
    replay : Replay or None
        What came of computing the lock again; None where it was not.
    aside : tuple of str
        What the replay could not compare, and why.
    not_replayed : str or None
        Why it was not.
    own_lock : str or None
        Name of the lock of the recipient's own table, where its columns have other names.
    """

    folder: Path
    program: str
    plan: str
    members: Mapping[str, Member]
    chains: tuple[str, ...]
    lock: str | None
    safe: str | None
    replay: Replay | None
    aside: tuple[str, ...]
    not_replayed: str | None
    own_lock: str | None = None


def receive_bundle(
    bundle: Path,
    folder: Path,
    *,
    data: Path | None = None,
    columns: Mapping[str, str] | str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
) -> Received:
    """Check a bundle and unpack it; the arguments are those of ``beforehand.receive``.

    Everything happens in a temporary folder first: a bundle with a fault leaves nothing behind.

    Raises
    ------
    InputError
        With every fault of the bundle, its plan, its chains or the recipient's table.
    WriteError
        The folder cannot be written; nothing is in it that was not before.
    """
    if columns is not None and data is None:
        what = "other names of columns need a table of their own: give it by --data"
        raise InputError([Fault(file=str(bundle), line=None, place="columns", what=what, code="receive")])
    with opened(bundle) as (archive, manifest):
        names = [*sorted(manifest.members), MANIFEST]
        own_name = beside(manifest.plan, OWN_LOCK).name
        require_free(folder, names if columns is None else [*names, own_name])
        with beside_folder(folder) as scratch:
            looked, own = _looked_at(archive, manifest, scratch, bundle, data, columns, progress)
            # Afresh, so that what is put in place is the bundle's own and nothing that came beside it.
            fresh = scratch / "fresh"
            unpack(archive, names, fresh)
            if own is not None:
                write_lock(own, fresh / own_name)
                names.append(own_name)
            place(fresh, folder, names)
    return replace(looked, folder=folder, own_lock=None if own is None else own_name)


def chains_hold(plan_path: Path) -> None:
    """Check the seals and looks beside a plan; a seam at which a test may put something else."""
    from beforehand.sealing import verify_chains

    verify_chains(plan_path)


def _looked_at(
    archive: zipfile.ZipFile,
    manifest: Manifest,
    scratch: Path,
    bundle: Path,
    data: Path | None,
    columns: Mapping[str, str] | str | os.PathLike[str] | None,
    progress: Progress | None,
) -> tuple[Received, Lock | None]:
    """What a bundle holds, read and computed in a folder of its own; the lock of a table of other names."""
    there = scratch / "looked-at"
    unpack(archive, sorted(manifest.members), there)
    try:
        plan = read_plan(there / manifest.plan)
        chains = tuple(
            name
            for ending in (".seal.yaml", ".looks")
            if (name := beside(manifest.plan, ending).name) in manifest.members
        )
        if chains:
            chains_hold(there / manifest.plan)
        lock = None if manifest.lock is None else _lock_of(there, manifest.lock, plan)
        replayed, aside, reason, own = _replayed(manifest, there, plan, lock, data, columns, progress)
    except InputError as error:
        raise type(error)([_renamed(fault, there, bundle) for fault in error.faults]) from None
    received = Received(
        folder=there,
        program=manifest.program,
        plan=manifest.plan,
        members=dict(manifest.members),
        chains=chains,
        lock=manifest.lock,
        safe=manifest.safe,
        replay=replayed,
        aside=aside,
        not_replayed=reason,
    )
    return received, own


def _renamed(fault: Fault, there: Path, bundle: Path) -> Fault:
    """A fault of an unpacked file, named as a file of the bundle."""
    if Path(fault.file).is_relative_to(there):
        return replace(fault, file=f"{bundle}: {Path(fault.file).relative_to(there).as_posix()}")
    return fault


def _lock_of(there: Path, name: str, plan: Plan) -> Lock:
    """The lock of the bundle, which must be of its plan."""
    lock = read_lock(there / name)
    if lock.plan.whole != whole_digest(plan):
        what = "is not the record of the plan in the bundle: their digests differ"
        raise InputError(
            [Fault(file=str(there / name), line=None, place="plan.whole", what=what, code="receive.lock")]
        )
    return lock


def _replayed(
    manifest: Manifest,
    there: Path,
    plan: Plan,
    lock: Lock | None,
    data: Path | None,
    columns: Mapping[str, str] | str | os.PathLike[str] | None,
    progress: Progress | None,
) -> tuple[Replay | None, tuple[str, ...], str | None, Lock | None]:
    """The lock computed again where a table is at hand, what was set aside, and why it was not.

    Last comes the lock of a table whose columns have other names, with these names in it.
    """
    first = None if lock is None or lock.sealed_plan is None else plan_from_mapping(lock.sealed_plan.written)
    names = _names(columns, plan, first)
    if lock is None:
        reason = (
            "the bundle holds no lock" if manifest.safe is None else "a share-safe copy cannot be replayed"
        )
        return None, (), reason, None
    hashed = data is None and manifest.data is not None and manifest.data.labels == "hashed"
    if data is not None:
        read: Read = own_table(data, names)
    elif manifest.data is None:
        return None, (), "the bundle holds no table; give one by --data", None
    else:
        file = there / manifest.data.file
        read = hashed_table(file) if hashed else own_table(file, {})
    standing = Standing(record=lock.seal, sealed=first)
    new = run_plan(plan, read, progress, standing, learned_in(lock), labels=str).lock
    own = None
    if names:
        # Labels that the plan hides are hidden here too, by a key that nobody keeps.
        mine = new
        if plan.data.labels_in_lock == "hashed":
            hide = keyed(secrets.token_bytes(KEY_BYTES))
            mine = run_plan(plan, read, progress, standing, learned_in(lock), labels=hide).lock
        own = mine.model_copy(update={"data": mine.data.model_copy(update={"columns": names})})
    # Names of columns are the table's own, as the file's place is.
    new = new.model_copy(update={"data": new.data.model_copy(update={"columns": lock.data.columns})})
    aside = [COLUMNS_ASIDE] if names else []
    if hashed:
        aside.append(FINGERPRINT_ASIDE)
    if hashed or lock.data.labels == "hashed":
        same_labels = hashed and lock.data.labels == "hashed"
        if not same_labels:
            aside.append(LABELS_ASIDE)
            new = as_labelled(lock, new, fingerprint=hashed)
        else:
            fingerprint = {"fingerprint": lock.data.fingerprint}
            new = new.model_copy(update={"data": new.data.model_copy(update=fingerprint)})
    return replay_of(lock, new), tuple(aside), None, own


def _names(
    columns: Mapping[str, str] | str | os.PathLike[str] | None, plan: Plan, first: Plan | None
) -> dict[str, str]:
    """Names of the recipient's columns, each of a column that a run reads."""
    if columns is None:
        return {}
    plans = plans_read(plan, first)
    if isinstance(columns, Mapping):
        checked_names(columns, plans, "columns")
        return dict(columns)
    return column_names(columns, plans)

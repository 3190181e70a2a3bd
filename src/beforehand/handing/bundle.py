"""What is handed over: a plan with all that stands beside it, in one file that can be checked."""

from __future__ import annotations

import hashlib
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from beforehand.faults import DataError, Fault, InputError, WriteError
from beforehand.handing import limits
from beforehand.handing.dictionary import dictionary_text
from beforehand.handing.manifest import MANIFEST, Manifest, Member, Rows
from beforehand.handing.packing import packed
from beforehand.handing.readme import READ_ME, read_me
from beforehand.handing.safe import FEWEST, safe_text
from beforehand.handing.tables import columns_read, label_uses, plans_read, table_bytes, unusable_label
from beforehand.lock import Lock, read_lock
from beforehand.lock.files import write_whole
from beforehand.lock.schema import lock_schema_text
from beforehand.plan import Plan, plan_from_mapping, read_plan, whole_digest
from beforehand.plan.schema import schema_text
from beforehand.rehearsing.reading import RECORD_SUFFIX
from beforehand.rehearsing.text import rehearsal_schema_text
from beforehand.runs import hashed_labels
from beforehand.sealing import beside
from beforehand.table import Table, read_table
from beforehand.version import __version__

Labels = Literal["shown", "hashed"]

LOCK_ENDING = ".lock.yaml"
SAFE_ENDING = ".safe.yaml"
DICTIONARY = "dictionary.yaml"

# What shows that the plan came first; it holds digests of the table, and no number of it.
_CHAINS = (".seal.yaml", ".looks")

# What a run, a refresh or a report made of the table.
_MADE_OF_ROWS = (".refresh.yaml", ".refreshed.lock.yaml", ".report.html", ".report.docx", ".report.md")


@dataclass(frozen=True, slots=True, kw_only=True)
class Handover:
    """What was packed.

    Attributes
    ----------
    bundle : Path
    sha256 : str
        Of the bundle, to be told to the recipient by another way.
    members : mapping of str to Member
        Size and digest of every file in it but the manifest.
    data : Rows or None
        The table, where it went along.
    rows : int or None
        Its rows.
    share_safe : bool
        Whether the lock went along as a copy that gives no row away.
    cautions : tuple of str
        What the sender should know.
    """

    bundle: Path
    sha256: str
    members: Mapping[str, Member]
    data: Rows | None
    rows: int | None
    share_safe: bool
    cautions: tuple[str, ...]


def hand_over(
    path: Path,
    output: Path,
    *,
    data: Path | None = None,
    with_data: bool = False,
    labels: Labels = "hashed",
    share_safe: bool = False,
) -> Handover:
    """Pack a plan and what stands beside it; the arguments are those of ``beforehand.handover``.

    Raises
    ------
    InputError
        With every fault of the plan, its lock or its table, or of what is asked for.
    WriteError
        The bundle cannot be written, or something else has its name.
    """
    if with_data and share_safe:
        raise _refused(
            path, "share_safe", "a share-safe bundle holds no rows: leave out the one or the other"
        )
    _refuse_to_replace(output)
    plan = read_plan(path)
    lock = _lock_of(path, plan)
    if share_safe and lock is None:
        what = f"there is no {beside(path, LOCK_ENDING).name}: run the plan first"
        raise _refused(path, "share_safe", what)
    table = _table_of(plan, data, needed=with_data)
    first = None if lock is None or lock.sealed_plan is None else plan_from_mapping(lock.sealed_plan.written)
    files: dict[str, bytes] = _files_beside(path, share_safe)
    rows: Rows | None = None
    if with_data and table is not None:
        rows, files[plan.data.file] = _rows(path, plan, first, data, labels)
        _require_the_same(path, plan, lock, table)
    if share_safe and lock is not None:
        files[beside(path, SAFE_ENDING).name] = safe_text(lock).encode()
    fewest = FEWEST if share_safe else 1
    generated = {
        "plan.schema.json": schema_text().encode(),
        "lock.schema.json": lock_schema_text().encode(),
        DICTIONARY: dictionary_text(plan, table, fewest=fewest).encode(),
        READ_ME: read_me(plan.title, path.name, lock, rows, share_safe=share_safe).encode(),
    }
    if any(name.endswith(RECORD_SUFFIX) for name in files):
        generated["rehearsal.schema.json"] = rehearsal_schema_text().encode()
    _require_good(path, [*files, *generated, MANIFEST], files | generated)
    files |= generated
    members = {name: member_of(files[name]) for name in sorted(files)}
    manifest = Manifest(
        bundle=1,
        program=f"beforehand {__version__}",
        plan=path.name,
        lock=None if lock is None or share_safe else beside(path, LOCK_ENDING).name,
        safe=beside(path, SAFE_ENDING).name if share_safe else None,
        data=rows,
        members=members,
    )
    content = packed(files | {MANIFEST: manifest.text().encode()})
    write_whole(output, content)
    return Handover(
        bundle=output,
        sha256=hashlib.sha256(content).hexdigest(),
        members=members,
        data=rows,
        rows=None if rows is None or table is None else table.ledger[0].rows,
        share_safe=share_safe,
        cautions=_cautions(plan, lock, rows, share_safe),
    )


def member_of(content: bytes) -> Member:
    """Size and digest of a file."""
    return Member(sha256=hashlib.sha256(content).hexdigest(), size=len(content))


def _refused(path: Path, place: str, what: str) -> InputError:
    return InputError([Fault(file=str(path), line=None, place=place, what=what, code=f"handover.{place}")])


def _refuse_to_replace(output: Path) -> None:
    """Only an earlier bundle is replaced, and nothing is packed for a folder that is not there."""
    if not output.parent.is_dir():
        raise WriteError(f"{output}: cannot be written: its folder does not exist")
    if not output.exists():
        return
    try:
        with zipfile.ZipFile(output) as bundle:
            ours = {MANIFEST, READ_ME} <= set(bundle.namelist())
    except (OSError, zipfile.BadZipFile, NotImplementedError):
        ours = False
    if not ours:
        raise WriteError(f"{output}: is not a bundle and is left as it is; name another file")


def _lock_of(path: Path, plan: Plan) -> Lock | None:
    """The lock beside a plan, if there is one: it must be of this very plan."""
    file = beside(path, LOCK_ENDING)
    if not file.exists():
        return None
    lock = read_lock(file)
    if lock.plan.whole != whole_digest(plan):
        what = f"is the record of another plan than {path.name} is now: run it again"
        raise InputError([Fault(file=str(file), line=None, place="plan", what=what, code="handover.lock")])
    return lock


def _table_of(plan: Plan, data: Path | None, *, needed: bool) -> Table | None:
    """The table, for the dictionary; where nobody asked for it, it may be elsewhere."""
    try:
        return read_table(plan, data)
    except DataError as error:
        if needed or data is not None or {one.code for one in error.faults} != {"no_file"}:
            raise
        return None


def _rows(
    path: Path, plan: Plan, first: Plan | None, data: Path | None, labels: Labels
) -> tuple[Rows, bytes]:
    """The table as it goes along, with labels as asked for."""
    plans = plans_read(plan, first)
    label = plan.data.row_label
    if label is None:
        kind: Literal["shown", "hashed", "none"] = "none"
    else:
        kind = labels
        uses = label_uses(plans) if labels == "hashed" else ()
        if uses:
            raise unusable_label(str(path), label, uses)
    hashes = hashed_labels(plan) if kind == "hashed" else None
    return Rows(file=plan.data.file, labels=kind), table_bytes(plan, plans, data, hashes)


def _require_the_same(path: Path, plan: Plan, lock: Lock | None, table: Table) -> None:
    """A table that goes along with a lock must be the one of which it is the record."""
    if lock is not None and lock.data.fingerprint != table.fingerprint:
        what = f"is not the record of {plan.data.file} as it is: give its own table by --data, or run again"
        file = str(beside(path, LOCK_ENDING))
        raise InputError([Fault(file=file, line=None, place="data", what=what, code="handover.data")])


def _files_beside(path: Path, share_safe: bool) -> dict[str, bytes]:
    """The plan and what stands beside it under its name; never the key of its row labels."""
    endings = _CHAINS if share_safe else (*_CHAINS, LOCK_ENDING, *_MADE_OF_ROWS)
    found = [path, *(beside(path, ending) for ending in endings)]
    if not share_safe:
        start = beside(path, ".rehearsal").name
        rehearsals = [
            one for one in path.parent.iterdir() if one.name.startswith(start) and one.suffix == ".yaml"
        ]
        found += sorted(rehearsals)
    files: dict[str, bytes] = {}
    for file in found:
        if file != path and not file.exists():
            continue
        try:
            files[file.name] = file.read_bytes()
        except OSError as error:
            reason = (error.strerror or "the system refuses").lower()
            what = f"cannot be read: {reason}"
            raise InputError(
                [Fault(file=str(file), line=None, place="", what=what, code="unreadable")]
            ) from None
    return files


def _require_good(path: Path, names: list[str], files: Mapping[str, bytes]) -> None:
    """What a recipient would refuse is not packed."""
    faults = list(limits.name_faults(names, str(path)))
    for name, content in files.items():
        if len(content) > limits.LARGEST_MEMBER:
            what = f"has {len(content):,} bytes; a bundle takes files of at most {limits.LARGEST_MEMBER:,}"
            faults.append(Fault(file=str(path), line=None, place=name, what=what, code="bundle.size"))
    total = sum(map(len, files.values()))
    if total > limits.LARGEST_TOTAL:
        what = f"comes to {total:,} bytes with all that goes along; at most {limits.LARGEST_TOTAL:,} go"
        faults.append(Fault(file=str(path), line=None, place="", what=what, code="bundle.size"))
    if len(names) > limits.MOST_MEMBERS:
        what = f"comes to {len(names)} files with all that goes along; at most {limits.MOST_MEMBERS} go"
        faults.append(Fault(file=str(path), line=None, place="", what=what, code="bundle.members"))
    if faults:
        raise InputError(faults)


def _cautions(plan: Plan, lock: Lock | None, rows: Rows | None, share_safe: bool) -> tuple[str, ...]:
    """What the sender should know of what the bundle shows."""
    said: list[str] = []
    if lock is not None and not share_safe:
        said.append(
            "The lock has fits with and without single rows: for people who may see the data. "
            "--share-safe packs a copy that gives no row away."
        )
        if rows is not None and rows.labels == "hashed" and plan.data.labels_in_lock == "shown":
            said.append(
                "The table hides row labels and the lock shows those of flagged rows: "
                "labels_in_lock: hashed hides them there too."
            )
    if rows is not None and columns_read((plan,)):
        said.append("The table holds every value that the plan reads.")
    return tuple(said)

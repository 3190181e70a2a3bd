"""Finished blocks on disk, so that an interrupted rehearsal can go on where it was.

The file begins with one line that says which rehearsal it belongs to. Each block follows as one line of
JSON, with the length and the digest of what comes after it, and the arrays of its trials. A block is
added whole: one that an interrupt cut off has not its digest, and is computed again.
"""

from __future__ import annotations

import contextlib
import hashlib
import io
import json
import os
import zipfile
from collections.abc import Iterator, Mapping
from dataclasses import fields
from pathlib import Path
from typing import Any

import numpy as np

from beforehand.faults import Fault, InputError, WriteError
from beforehand.plan import Plan
from beforehand.plan.canonical import decisions
from beforehand.rehearsing.engines.blocks import Block
from beforehand.rehearsing.trials import Trials
from beforehand.version import __version__

SUFFIX = ".rehearsal.part"
_HEAD = b"beforehand rehearsal part 1 "

# Blocks of a plan that no replicate depends on; how many replicates there are is none of them either.
_BESIDE = ("alternatives", "refresh", "rehearsal")


def rehearsal_key(plan: Plan, fingerprint: str | None, seed: int) -> str:
    """Digest of all that a replicate depends on but its number, ``sha256:…``.

    Parameters
    ----------
    plan : Plan
    fingerprint : str or None
        Of the table; None without one.
    seed : int
    """
    said = {key: value for key, value in decisions(plan).items() if key not in _BESIDE}
    parts = {
        "program": __version__, "decisions": said, "data": fingerprint, "seed": seed,
        "folds": plan.rehearsal.folds, "leave_out": plan.rehearsal.leave_out,
    }  # fmt: skip
    text = json.dumps(parts, sort_keys=True, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return "sha256:" + hashlib.sha256(text.encode()).hexdigest()


class Saved:
    """The part file of one rehearsal, open for adding blocks; a context manager.

    Parameters
    ----------
    path : Path
    name : str
        How faults name the file.
    key : str
        Digest of the rehearsal.
    resume : bool
        Whether blocks that are there count; else the file is begun anew.

    Raises
    ------
    InputError
        When the file is of another rehearsal, or of something else altogether.
    WriteError
        When the file cannot be written.
    """

    def __init__(self, path: Path, key: str, *, resume: bool, name: str | None = None) -> None:
        self._path, self._name = path, name or str(path)
        self._blocks: dict[str, dict[Block, Trials]] = {}
        self._holds_something = False
        head = _HEAD + key.encode() + b"\n"
        content = self._content()
        if content is not None:
            self._require_ours(content, head, resume=resume)
            if (
                not resume
                and content.startswith(head)
                and any(True for _ in _read_blocks(content, len(head)))
            ):
                what = (
                    "holds what an interrupted rehearsal of this plan finished: --resume goes on with it; "
                    "take the file away to begin anew"
                )
                raise InputError([self._fault(what, "unfinished")])
        end = 0
        if content is not None and resume:
            # Less than the first line is there when an interrupt cut that off.
            end = len(head) if content.startswith(head) else 0
            for world, block, trials, stop in _read_blocks(content, end):
                self._blocks.setdefault(world, {})[block] = trials
                self._holds_something = True
                end = stop
        with self._writing():
            self._file = io.BufferedWriter(io.FileIO(path, "r+" if end else "w"))
            # What an interrupt cut off is taken away before anything is added.
            self._file.truncate(end)
            self._file.seek(end)
            if not end:
                self._add(head)

    def __enter__(self) -> Saved:
        return self

    def __exit__(self, *_: object) -> None:
        if self._holds_something:
            self.close()
        else:
            # A fault before the first block was finished leaves nothing behind.
            self.remove()

    def blocks(self, world: str) -> Mapping[Block, Trials]:
        """Blocks of a world that were finished before; handed out once, so that they are not held twice."""
        return self._blocks.pop(world, {})

    def keep(self, world: str, block: Block, trials: Trials) -> None:
        """Add a finished block; it has reached the disk when this returns."""
        content = _packed(trials)
        line = {
            "world": world, "first": block[0], "last": block[1],
            "bytes": len(content), "sha256": hashlib.sha256(content).hexdigest(),
        }  # fmt: skip
        with self._writing():
            self._add(json.dumps(line).encode() + b"\n" + content)
        self._holds_something = True

    def close(self) -> None:
        """Close the file and leave it where it is."""
        with contextlib.suppress(OSError):
            self._file.close()

    def remove(self) -> None:
        """Close the file and take it away: everything in it stands elsewhere now."""
        self.close()
        with contextlib.suppress(OSError):
            self._path.unlink()

    def _add(self, content: bytes) -> None:
        self._file.write(content)
        self._file.flush()
        os.fsync(self._file.fileno())

    def _content(self) -> bytes | None:
        """What stands in the file; None where there is none."""
        try:
            return self._path.read_bytes()
        except FileNotFoundError:
            return None
        except OSError as error:
            reason = (error.strerror or "the system refuses").lower()
            raise InputError([self._fault(f"cannot be read: {reason}", "unreadable")]) from error

    def _require_ours(self, content: bytes, head: bytes, *, resume: bool) -> None:
        """A file of this rehearsal; where it is begun anew, of any."""
        # An interrupt may have cut off the first line itself.
        if head.startswith(content):
            return
        if not content.startswith(_HEAD):
            what = "is not the part of a rehearsal; it is left as it is, move it out of the way"
            raise InputError([self._fault(what, "not_a_part")])
        if resume and not content.startswith(head):
            what = (
                "is of another rehearsal: plan, table, seed or program have changed since; "
                "begin anew without --resume"
            )
            raise InputError([self._fault(what, "other_rehearsal")])

    def _fault(self, what: str, code: str) -> Fault:
        return Fault(file=self._name, line=None, place="", what=what, code=code)

    @contextlib.contextmanager
    def _writing(self) -> Iterator[None]:
        """A failure to write, as one."""
        try:
            yield
        except OSError as error:
            reason = (error.strerror or "the system refuses").lower()
            raise WriteError(f"{self._name}: cannot be written: {reason}") from error


def _packed(trials: Trials) -> bytes:
    """The arrays of some trials."""
    packed = io.BytesIO()
    np.savez(packed, **{one.name: getattr(trials, one.name) for one in fields(Trials)})
    return packed.getvalue()


def _read_blocks(content: bytes, start: int) -> Iterator[tuple[str, Block, Trials, int]]:
    """Whole blocks from a place on, each with the place where it ends; the first that is not ends it."""
    while True:
        stop = content.find(b"\n", start)
        if stop < 0:
            return
        try:
            line: dict[str, Any] = json.loads(content[start:stop])
            end = stop + 1 + int(line["bytes"])
            packed = content[stop + 1 : end]
            if end > len(content) or hashlib.sha256(packed).hexdigest() != line["sha256"]:
                return
            block = (int(line["first"]), int(line["last"]))
            with np.load(io.BytesIO(packed), allow_pickle=False) as arrays:
                trials = Trials(**{one.name: arrays[one.name] for one in fields(Trials)})
            world = str(line["world"])
        except (ValueError, KeyError, TypeError, zipfile.BadZipFile):
            return
        if trials.count != block[1] - block[0]:
            return
        yield world, block, trials, end
        start = end

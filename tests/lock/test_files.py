"""Files are written whole or not at all, whatever goes wrong."""

from __future__ import annotations

import errno
import os
import random
import signal
import stat
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from beforehand.faults import WriteError
from beforehand.lock.files import write_whole

OLD, NEW = b"the old content\n", b"the new content\n"


@pytest.fixture
def target(tmp_path: Path) -> Path:
    """Give a file with old content."""
    path = tmp_path / "rooms.lock.yaml"
    path.write_bytes(OLD)
    return path


def failing(number: int) -> Callable[..., Any]:
    """Make a call of the system that fails."""

    def fail(*_: Any, **__: Any) -> Any:
        raise OSError(number, os.strerror(number))

    return fail


def alone(target: Path) -> bool:
    """Tell whether nothing stands beside the file."""
    return list(target.parent.iterdir()) == [target]


def test_content_takes_the_place_of_what_stood_there(target: Path) -> None:
    """The new content is there, whole, and nothing beside it."""
    write_whole(target, NEW)
    assert target.read_bytes() == NEW
    assert alone(target)


def test_a_path_may_be_text_and_content_may_be_empty(tmp_path: Path) -> None:
    """A new file needs no old one."""
    write_whole(str(tmp_path / "new"), b"")
    assert (tmp_path / "new").read_bytes() == b""


def test_permission_bits_are_kept(target: Path) -> None:
    """Who could read the old file can read the new one, and nobody else."""
    target.chmod(0o640)
    write_whole(target, NEW)
    assert stat.S_IMODE(target.stat().st_mode) == 0o640


def test_a_new_file_has_the_bits_of_any_new_file(tmp_path: Path) -> None:
    """The process's own mask decides, as for a file made in any other way."""
    mask = os.umask(0o027)
    try:
        write_whole(tmp_path / "new", NEW)
    finally:
        os.umask(mask)
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o640


def test_a_symbolic_link_stays_one(target: Path, tmp_path: Path) -> None:
    """What it points at is replaced, in its own folder."""
    elsewhere = tmp_path / "links"
    elsewhere.mkdir()
    link = elsewhere / "link.lock.yaml"
    link.symlink_to(target)
    write_whole(link, NEW)
    assert link.is_symlink()
    assert target.read_bytes() == NEW
    assert list(elsewhere.iterdir()) == [link]


def test_a_call_that_takes_fewer_bytes_is_repeated(target: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system may write a part of what it is given."""
    write = os.write
    monkeypatch.setattr(os, "write", lambda handle, content: write(handle, content[:3]))
    write_whole(target, NEW)
    assert target.read_bytes() == NEW


@pytest.mark.parametrize(
    ("call", "number", "reason"),
    [
        ("write", errno.ENOSPC, "no space is left on the disk"),
        ("fsync", errno.ENOSPC, "no space is left on the disk"),
        ("write", errno.EDQUOT, "the disk quota is used up"),
        ("fsync", errno.EIO, "the disk reports an error"),
        ("open", errno.EROFS, "the file system is read-only"),
        ("open", errno.EACCES, "its folder does not permit writing"),
        ("open", errno.EMFILE, "too many open files"),
        ("replace", errno.EPERM, "its folder does not permit writing"),
        ("chmod", errno.EPERM, "its folder does not permit writing"),
    ],
)
def test_what_the_system_refuses_leaves_the_old_file_alone(
    target: Path, monkeypatch: pytest.MonkeyPatch, call: str, number: int, reason: str
) -> None:
    """A full disk or a read-only folder is told in one line; the old file is whole, nothing is left."""
    with monkeypatch.context() as patch:
        patch.setattr(os, call, failing(number))
        with pytest.raises(WriteError) as raised:
            write_whole(target, NEW)
    assert str(raised.value) == f"{target}: cannot be written: {reason}"
    assert target.read_bytes() == OLD
    assert alone(target)


@pytest.mark.parametrize("call", ["chmod", "write", "fsync", "replace"])
def test_an_interrupt_leaves_the_old_file_alone(
    target: Path, monkeypatch: pytest.MonkeyPatch, call: str
) -> None:
    """Whatever it comes between, the old file is whole, nothing is left, and the interrupt goes on."""

    def interrupt(*_: Any, **__: Any) -> Any:
        raise KeyboardInterrupt

    with monkeypatch.context() as patch:
        patch.setattr(os, call, interrupt)
        with pytest.raises(KeyboardInterrupt):
            write_whole(target, NEW)
    assert target.read_bytes() == OLD
    assert alone(target)


def test_an_interrupt_after_the_new_name_leaves_the_new_file(
    target: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Once the name is taken over, the new content is whole."""
    replace = os.replace

    def replace_then_interrupt(source: str, goal: Path) -> None:
        replace(source, goal)
        raise KeyboardInterrupt

    with monkeypatch.context() as patch:
        patch.setattr(os, "replace", replace_then_interrupt)
        with pytest.raises(KeyboardInterrupt):
            write_whole(target, NEW)
    assert target.read_bytes() == NEW
    assert alone(target)


def test_a_folder_that_cannot_be_synced_is_no_fault(target: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Some systems sync no folders; the file is whole all the same."""
    fsync = os.fsync

    def files_only(handle: int) -> None:
        if stat.S_ISDIR(os.fstat(handle).st_mode):
            raise OSError(errno.EINVAL, "Invalid argument")
        fsync(handle)

    monkeypatch.setattr(os, "fsync", files_only)
    write_whole(target, NEW)
    assert target.read_bytes() == NEW


def test_places_that_no_file_can_have_are_told(tmp_path: Path) -> None:
    """A folder, a missing folder, a file as a folder, a long name, a circle of links, a device, no name."""
    (tmp_path / "file").write_bytes(OLD)
    (tmp_path / "circle").symlink_to(tmp_path / "circle")
    os.mkfifo(tmp_path / "pipe")
    for name, reason in (
        (".", "it is a folder"),
        ("none/x", "its folder does not exist"),
        ("file/x", "a part of its path is not a folder"),
        ("x" * 300, "its name is too long"),
        ("circle", "its symbolic links lead in a circle"),
        ("pipe", "it is not a regular file"),
    ):
        path = tmp_path / name
        with pytest.raises(WriteError) as raised:
            write_whole(path, NEW)
        assert str(raised.value) == f"{path}: cannot be written: {reason}"
    with pytest.raises(WriteError) as raised:
        write_whole("a\0b", NEW)
    assert str(raised.value) == r"'a\x00b': cannot be written: no file can have this name"
    assert (tmp_path / "file").read_bytes() == OLD


@pytest.mark.parametrize("name", ["x" * 255, "rooms é × 気.lock.yaml", "-", " "])
def test_names_that_are_lawful_are_written(tmp_path: Path, name: str) -> None:
    """The temporary name does not grow with the file's."""
    write_whole(tmp_path / name, NEW)
    assert (tmp_path / name).read_bytes() == NEW


def numbered(number: int) -> bytes:
    """Make content of some megabytes that shows whether it is whole."""
    return b"%08d\n" % number * (120_000 + number % 7 * 40_000) + b"end\n"


def is_whole(content: bytes) -> bool:
    """Tell whether content is one that was written, from its first line to its last."""
    return content == numbered(int(content[:8]))


def test_a_killed_process_leaves_the_old_file_or_the_new_one(tmp_path: Path) -> None:
    """Three dozen processes are killed at random moments of writing; the file is never half."""
    path = tmp_path / "rooms.lock.yaml"
    path.write_bytes(numbered(0))
    moments = random.Random(20261201)
    first, seen = 1, set()
    for _ in range(36):
        child = os.fork()
        if child == 0:
            # The child does nothing but write, and never comes back into the test.
            try:
                for number in range(first, first + 10_000):
                    write_whole(path, numbered(number))
            finally:
                os._exit(1)
        time.sleep(moments.uniform(0.005, 0.06))
        assert is_whole(path.read_bytes())
        os.kill(child, signal.SIGKILL)
        _, status = os.waitpid(child, 0)
        assert os.WIFSIGNALED(status)
        content = path.read_bytes()
        assert is_whole(content)
        seen.add(content[:8])
        first += 10_000
        left = [other for other in tmp_path.iterdir() if other != path]
        # A killed process cannot clean up; what it leaves is hidden and has none of the names in use.
        assert all(other.name.startswith(".beforehand-") and other.suffix == ".part" for other in left)
        assert len(left) <= 1
        for other in left:
            other.unlink()
    assert len(seen) > 1
    write_whole(path, NEW)
    assert path.read_bytes() == NEW

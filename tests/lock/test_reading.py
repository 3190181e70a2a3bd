"""What is said about a file that is not a lock as it was written."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from beforehand.faults import LockError
from beforehand.lock import Lock, lock_from_bytes, lock_from_text, lock_text, read_lock, write_lock
from beforehand.lock import reading as reading_module
from beforehand.lock.writing import digest_of

CHANGED = "x.lock.yaml: it was changed after it was written: its digest does not fit"
CUT_SHORT = "x.lock.yaml: it is cut short: its last line should be its digest"


def resealed(text: str) -> str:
    """Give a changed text a digest that fits."""
    covered, rest = text.split("environment:\n")
    environment = rest.split("digest:")[0]
    return f'{covered}environment:\n{environment}digest: "{digest_of(covered.encode())}"\n'


def message(text: str | bytes) -> str:
    """Read it and give what is said."""
    with pytest.raises(LockError) as raised:
        lock_from_bytes(text if isinstance(text, bytes) else text.encode(), "x.lock.yaml")
    return str(raised.value)


def test_a_lock_comes_back_from_its_file(lock: Lock, tmp_path: Path) -> None:
    """A file that was written is read, and written again it has the same bytes."""
    path = tmp_path / "rooms.lock.yaml"
    write_lock(lock, path)
    back = read_lock(path)
    assert back.answer == lock.answer
    assert back.digest.startswith("sha256:")
    before = path.read_bytes()
    write_lock(back, path)
    assert path.read_bytes() == before


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (lambda text: text.replace("6.41", "6.42"), CHANGED),
        (lambda text: text.replace("# Written by", "# written by"), CHANGED),
        (lambda text: text[:-2], CUT_SHORT),
        (lambda text: text[: len(text) // 2], CUT_SHORT),
        (lambda text: text + "more: 1\n", CUT_SHORT),
        (lambda text: text.replace("\nenvironment:", "\nsurroundings:"), CHANGED),
        (
            lambda text: text.replace("lock: 1\n", "lock: 2\n"),
            "x.lock.yaml: it is of version 2 of the lock, this program reads 1: a newer program wrote it",
        ),
        (
            lambda text: text.replace("lock: 1\n", "lock: 0\n"),
            "x.lock.yaml: it is of version 0 of the lock, this program reads 1: there is no such version",
        ),
        (lambda text: "", "x.lock.yaml: it is no lockfile: it does not begin with 'lock: 1'"),
        (
            lambda text: "language: 1\ntitle: A plan\n",
            "x.lock.yaml: it is no lockfile: it does not begin with 'lock: 1'",
        ),
        (
            lambda text: text.replace("\n", "\r\n"),
            "x.lock.yaml: its line ends were changed to CRLF; store it as it was written, with LF",
        ),
        (
            lambda text: text.replace("status: adopted", "<<<<<<< HEAD\nstatus: adopted\n=======\n>>>>>>> b"),
            "x.lock.yaml: it holds an unfinished merge; take one side or run the plan again",
        ),
        (
            lambda text: f"<<<<<<< HEAD\n{text}",
            "x.lock.yaml: it holds an unfinished merge; take one side or run the plan again",
        ),
    ],
)
def test_each_damage_has_its_own_sentence(lock: Lock, change: Callable[[str], str], said: str) -> None:
    """Tampering, cutting, versions, line ends and merges are told apart, each in one line."""
    assert message(change(lock_text(lock))) == said


NOT_WRITTEN_SO = "not the layout in which a lock is written"
NO_VALUE = "not the layout of a lock: a value on it cannot be read"
NO_ENTRY = "not the layout of a lock: it is neither 'key: value' nor '- item'"
NO_INDENT = "not the layout of a lock: its indent fits no line above"
NO_NEST = "not the layout of a lock: it should be indented by two blanks under its key"
STATUS = "Input should be 'adopted', 'mean_only', 'inconclusive' or 'stopped'"


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("status: adopted", "status: splendid", f" status: {STATUS}"),
        ("status: adopted\n", "", " status: Field required"),
        ("rows: 412\n", 'rows: "412"\n', " data.rows: Input should be a valid integer"),
        ("rows: 412\n", "rows: 412\n  more: 1\n", " data.more: Extra inputs are not permitted"),
        ("title: Cold rooms\n", "title: Cold rooms # yes\n", f"{{line}}: {NO_VALUE}"),
        ("rows: 412\n", "rows: 412.0\n", " data.rows: Input should be a valid integer"),
        ("coefficient: 6.41,", "coefficient: .nan,", f"{{line}}: {NO_VALUE}"),
        ("coefficient: 6.41,", "coefficient: 6.41000000000001,", f"{{line}}: {NOT_WRITTEN_SO}"),
        ("coefficient: 6.41,", "coefficient: 6,", f"{{line}}: {NOT_WRITTEN_SO}"),
        ("rows: 412\n", "rows:  412\n", f"{{line}}: {NOT_WRITTEN_SO}"),
        ("press: 1.0e+22", "press: 1.0e22", f"{{line}}: {NOT_WRITTEN_SO}"),
        ("rows: 412\n", "rows: &a 412\n", f"{{line}}: {NO_VALUE}"),
        ("rows: 412\n", "rows: !!int 412\n", f"{{line}}: {NO_VALUE}"),
        ("\ndata:\n", "\n\tdata:\n", f"{{line}}: {NO_ENTRY}"),
        ("\ndata:\n", "\n data:\n", f"{{line}}: {NO_INDENT}"),
        ("  file: cold-rooms.csv", "\n  file: cold-rooms.csv", f"{{line}}: {NO_NEST}"),
        ("  file: cold-rooms.csv", "    file: cold-rooms.csv", f"{{line}}: {NO_NEST}"),
    ],
)
def test_a_forged_digest_does_not_help(lock: Lock, old: str, new: str, said: str) -> None:
    """Content that does not fit the models or the layout is refused whatever the digest says."""
    text = lock_text(lock)
    place = text.index(old)
    line = text.count("\n", 0, place) + 1 + old.startswith("\n")
    changed = text[:place] + new + text[place + len(old) :]
    assert message(resealed(changed)) == f"x.lock.yaml:{said.format(line=line)}"


def test_a_key_given_twice_is_refused(lock: Lock) -> None:
    """The last of two equal keys does not win."""
    text = lock_text(lock).replace("status: adopted\n", "status: stopped\nstatus: adopted\n", 1)
    assert message(resealed(text)).endswith("not the layout in which a lock is written")


def test_bytes_that_are_no_text_are_refused_with_their_line(lock: Lock) -> None:
    """Bad UTF-8 under a digest that fits has its own sentence."""
    raw = lock_text(lock).encode().replace(b"title: Cold", b"title: \xff\xfe")
    covered, rest = raw.split(b"environment:\n")
    digest = digest_of(covered).encode()
    raw = covered + b"environment:\n" + rest.split(b"digest:")[0] + b'digest: "' + digest + b'"\n'
    assert message(raw) == "x.lock.yaml:5: it is not UTF-8"


def test_the_environment_may_differ(lock: Lock) -> None:
    """What a run was made with stands outside the digest."""
    text = lock_text(lock).replace('"3.11.9"', '"3.13.1"')
    assert lock_from_text(text, "x").environment.python == "3.13.1"


def test_many_faults_are_told_in_part(lock: Lock) -> None:
    """Beyond twenty faults only their number is told."""
    text = lock_text(lock).replace("knife_edge: false", "knife_edge: 0").replace("exact: false", "exact: 0")
    said = message(resealed(text.replace("stays: true", "stays: 1"))).split("\n")
    assert len(said) == 21
    assert said[0] == "x.lock.yaml: rulings[0].knife_edge: Input should be a valid boolean"
    assert said[-1] == "x.lock.yaml: and 4 more of the kind"


def test_files_that_cannot_be_read_are_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A missing file, a folder and a file that is far too large have their own sentences."""
    path = tmp_path / "x.lock.yaml"
    for given, said in ((path, "there is no such file"), (tmp_path, "it is a folder, not a lockfile")):
        with pytest.raises(LockError) as raised:
            read_lock(given)
        assert str(raised.value) == f"{given}: {said}"
    path.write_bytes(b"lock: 1\n")
    monkeypatch.setattr(reading_module, "LARGEST_LOCK", 5)
    with pytest.raises(LockError) as raised:
        read_lock(path)
    assert str(raised.value) == f"{path}: it has 8 bytes; a lock has at most 5"


def test_reading_needs_no_table_and_no_statistics() -> None:
    """A lock is read without the libraries that a run needs."""
    code = (
        "import sys, beforehand.lock; heavy = {'pandas', 'statsmodels', 'scipy', 'numpy', 'yaml', 'typer'};"
        "sys.exit(', '.join(sorted(heavy & set(sys.modules))) or 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")

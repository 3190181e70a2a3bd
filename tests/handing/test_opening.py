"""Bundles from a stranger: each trap is refused with its line, and nothing is written."""

from __future__ import annotations

import io
import json
import stat
import struct
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import beforehand
from beforehand.faults import InputError
from beforehand.handing import MANIFEST, MOST_MEMBERS, limits

Refused = Callable[[bytes], list[str]]


@pytest.fixture
def refused(bundle: Path, racks: Any, tmp_path: Path) -> Refused:
    """The lines with which a bundle is refused, once it is sure that nothing was written anywhere."""

    def lines(content: bytes) -> list[str]:
        trap = tmp_path / "trap.zip"
        trap.write_bytes(content)
        before = racks.everything_below(tmp_path)
        with pytest.raises(InputError) as caught:
            beforehand.receive(trap, tmp_path / "got")
        assert racks.everything_below(tmp_path) == before
        assert all(fault.code.startswith("bundle.") for fault in caught.value.faults)
        return [line.removeprefix(f"{trap}: ") for line in str(caught.value).splitlines()]

    return lines


@pytest.fixture
def files(bundle: Path, racks: Any) -> dict[str, bytes]:
    """The members of a good bundle."""
    found: dict[str, bytes] = racks.files_in(bundle)
    return found


def with_info(files: dict[str, bytes], name: str, **fields: Any) -> bytes:
    """The files as a zip in which one member has odd fields."""
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w") as made:
        for one, content in files.items():
            info = zipfile.ZipInfo(one)
            for key, value in fields.items() if one == name else ():
                setattr(info, key, value)
            made.writestr(info, content)
    return written.getvalue()


def test_the_same_files_zipped_by_another_program_are_taken(
    files: dict[str, bytes], racks: Any, tmp_path: Path
) -> None:
    """The traps below are refused for what is wrong with them, not for how they were made."""
    (tmp_path / "good.zip").write_bytes(racks.zipped(files))
    beforehand.receive(tmp_path / "good.zip", tmp_path / "got")
    assert {name: (tmp_path / "got" / name).read_bytes() for name in files} == files


@pytest.mark.parametrize(
    ("name", "what"),
    [
        ("../slipped.txt", "leads out of the folder"),
        ("a/../../slipped.txt", "leads out of the folder"),
        ("..", "leads out of the folder"),
        ("/slipped.txt", "has an absolute path for a name"),
        ("C:/slipped.txt", "has an absolute path for a name"),
        ("c:slipped.txt", "has an absolute path for a name"),
        ("..\\slipped.txt", "has a backslash in its name"),
        ("a//b.txt", "is a folder, or has an empty part in its path"),
        ("a/./b.txt", "is a folder, or has an empty part in its path"),
        ("folder/", "is a folder, or has an empty part in its path"),
        ("racks.csv:stream", "has a name that not every system can hold"),
        ("nul.txt", "has a name that not every system can hold"),
        ("a/COM1", "has a name that not every system can hold"),
        ("racks.csv.", "has a name that not every system can hold"),
        ("bell\x07.txt", "has a name with signs that do not print"),
        ("x" * 201, "has a name of 201 characters; at most 200 are let in"),
    ],
)
def test_names_that_lead_elsewhere(
    name: str, what: str, files: dict[str, bytes], racks: Any, refused: Refused
) -> None:
    """Whether or not the manifest lists them."""
    slip = files | {name: b"slipped"}
    assert refused(racks.zipped(racks.listed(slip))) == [f"{name}: {what}"]
    assert refused(racks.zipped(slip)) == [f"{name}: {what}"]


def test_a_name_that_is_cut_at_a_nul(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """The name is looked at as it stands in the file, not as a library shortens it."""
    content = racks.zipped(files | {"racks.txt!x": b"-"}).replace(b"racks.txt!x", b"racks.txt\x00x")
    assert refused(content) == ["racks.txt\x00x: has a name with signs that do not print"]


def test_links_and_special_files(files: dict[str, bytes], refused: Refused) -> None:
    """Neither a link, which the next member could be written through, nor a pipe."""
    link = with_info(files, "racks.csv", external_attr=(stat.S_IFLNK | 0o777) << 16)
    assert refused(link) == ["racks.csv: is a link"]
    pipe = with_info(files, "racks.csv", external_attr=(stat.S_IFIFO | 0o644) << 16)
    assert refused(pipe) == ["racks.csv: is not a regular file"]


def test_a_bomb_by_its_ratio(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """Refused by what its directory says, before a byte of it is unpacked."""
    bomb = racks.zipped(racks.listed(files | {"racks.report.md": bytes(10_000_000)}))
    (line,) = refused(bomb)
    assert line.startswith("racks.report.md: unpacks to 1,0")
    assert line.endswith(" times its size; at most 100 times is let in")


def test_a_bomb_by_its_size(
    files: dict[str, bytes], racks: Any, refused: Refused, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One member, all together, and the file itself, against lowered limits."""
    large = racks.zipped(racks.listed(files | {"racks.report.md": bytes(50_000)}), kind=zipfile.ZIP_STORED)
    monkeypatch.setattr(limits, "LARGEST_MEMBER", 200_000)
    assert refused(
        racks.zipped(racks.listed(files | {"racks.report.md": bytes(200_001)}), kind=zipfile.ZIP_STORED)
    ) == ["racks.report.md: unpacks to 200,001 bytes; a member has at most 200,000"]
    total = sum(len(content) for content in racks.listed(files | {"racks.report.md": bytes(50_000)}).values())
    monkeypatch.setattr(limits, "LARGEST_TOTAL", total - 1)
    assert refused(large) == [f"has {len(large):,} bytes; a bundle has at most {total - 1:,}"]
    packed = racks.zipped(racks.listed(files | {"racks.report.md": bytes(range(250)) * 200}))
    assert refused(packed)[-1] == f"unpacks to {total:,} bytes; a bundle has at most {total - 1:,}"


def test_a_directory_that_lies_about_sizes(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """No more is unpacked than is declared, and then the content is not what the manifest says."""
    honest = racks.zipped(racks.listed(files | {"racks.report.md": bytes(range(250)) * 20}))
    lying = bytearray(honest)
    place = honest.rindex(b"racks.report.md") - 46
    struct.pack_into("<I", lying, place + 24, 100)
    manifest = json.loads(racks.listed(files | {"racks.report.md": bytes(range(100))})[MANIFEST])
    assert refused(bytes(lying)) == [f"racks.report.md: has 100 bytes; {MANIFEST} says 5,000"]
    fitting = racks.listed(files | {"racks.report.md": bytes(range(250)) * 20})
    fitting[MANIFEST] = json.dumps(manifest).encode()
    lying = bytearray(racks.zipped(fitting))
    place = bytes(lying).rindex(b"racks.report.md") - 46
    struct.pack_into("<I", lying, place + 24, 100)
    assert refused(bytes(lying)) == ["racks.report.md: is damaged and cannot be unpacked"]


def test_too_many_members(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """A few too many are counted, very many are not even listed."""
    few = racks.listed(files | {f"racks.rehearsal-{n}.yaml": b"-" for n in range(MOST_MEMBERS)})
    assert refused(racks.zipped(few)) == [f"has {len(few)} members; a bundle has at most 64"]
    many = racks.zipped(files | {f"{n:06d}": b"" for n in range(70_000)})
    assert refused(many) == ["has more members than the 64 that a bundle may have"]


def test_one_name_twice(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """The same, in other letters, and as a file and a folder at once."""
    written = io.BytesIO(racks.zipped(files))
    with zipfile.ZipFile(written, "a") as made, pytest.warns(UserWarning, match="Duplicate name"):
        made.writestr("racks.csv", b"another")
    assert refused(written.getvalue()) == ["racks.csv: stands twice"]
    other = racks.zipped(racks.listed(files | {"RACKS.csv": b"-"}))
    assert refused(other) == ["RACKS.csv: is 'racks.csv' in other letters"]
    both = racks.zipped(racks.listed(files | {"racks.csv/x": b"-"}))
    assert refused(both) == ["racks.csv: is a file and a folder at once"]


def test_what_the_manifest_does_not_say(files: dict[str, bytes], racks: Any, refused: Refused) -> None:
    """A changed member, one more, one less, a wrong size, and no manifest."""
    changed = files["racks.csv"].replace(b"263.47", b"263.48")
    assert len(changed) == len(files["racks.csv"])
    assert refused(racks.zipped(files | {"racks.csv": changed})) == [
        f"racks.csv: was changed: its SHA-256 is not the one in {MANIFEST}"
    ]
    assert refused(racks.zipped(files | {"more.txt": b"-"})) == [f"more.txt: is not in {MANIFEST}"]
    less = {name: content for name, content in files.items() if name != "dictionary.yaml"}
    assert refused(racks.zipped(less)) == [f"dictionary.yaml: is in {MANIFEST} and not in the bundle"]
    longer = files | {"READ-ME.txt": files["READ-ME.txt"] + b"!"}
    size = len(files["READ-ME.txt"])
    assert refused(racks.zipped(longer)) == [f"READ-ME.txt: has {size + 1} bytes; {MANIFEST} says {size}"]
    none = {name: content for name, content in files.items() if name != MANIFEST}
    assert refused(racks.zipped(none)) == [f"holds no {MANIFEST}: it is not a bundle"]


@pytest.mark.parametrize(
    ("change", "line"),
    [
        (lambda text: "{", "is not JSON, or has a key twice"),
        (lambda text: text.replace('"plan":', '"plan": "x", "plan":'), "is not JSON, or has a key twice"),
        (lambda text: "[" * 100_000, "is not JSON, or has a key twice"),
        (
            lambda text: text.replace('"bundle": 1', '"bundle": 2'),
            "is of version 2, this program reads 1: a newer program made it",
        ),
        (lambda text: text.replace('"plan": "racks', '"plan": "bricks'), "names 'bricks.plan.yaml' and does"),
        (lambda text: text.replace('"safe": null', '"safe": 3'), "safe: input should be a valid string"),
        (lambda text: text.replace('"safe"', '"odd"'), "safe: field required"),
        (lambda text: "7", ": input should be"),
    ],
)
def test_a_manifest_that_is_none(
    change: Callable[[str], str], line: str, files: dict[str, bytes], racks: Any, refused: Refused
) -> None:
    """JSON with each key once, of this version, of this shape."""
    odd = files | {MANIFEST: change(files[MANIFEST].decode()).encode()}
    found = refused(racks.zipped(odd, kind=zipfile.ZIP_STORED))
    assert found[0].startswith(MANIFEST)
    assert line in found[0]


def test_files_that_are_no_bundle(
    bundle: Path, files: dict[str, bytes], refused: Refused, tmp_path: Path
) -> None:
    """Cut short, damaged in the middle, something else, empty, encrypted, packed otherwise, absent."""
    whole = bundle.read_bytes()
    assert refused(whole[:-10]) == ["is cut short, or no bundle: it does not end as one"]
    assert refused(whole[: len(whole) // 2]) == ["is cut short, or no bundle: it does not end as one"]
    assert refused(b"rack,water\n1,2\n") == ["is not a bundle"]
    assert refused(b"") == ["is not a bundle"]
    assert refused(b"PK") == ["is cut short, or no bundle: it does not end as one"]
    middle = whole.index(b"racks.lock.yaml") + 2000
    hurt = whole[:middle] + bytes(8) + whole[middle + 8 :]
    assert refused(hurt) == ["racks.lock.yaml: is damaged and cannot be unpacked"]
    directory = whole.rindex(b"PK\x01\x02")
    assert refused(whole[:directory] + b"XX" + whole[directory + 2 :]) == [
        "is damaged: its directory cannot be read"
    ]
    secret = bytearray(whole)
    place = whole.rindex(b"racks.csv", 0, whole.rindex(b"racks.lock.yaml")) - 46
    secret[place + 8] |= 1
    assert refused(bytes(secret)) == ["racks.csv: is encrypted"]
    other = io.BytesIO()
    with zipfile.ZipFile(other, "w", zipfile.ZIP_BZIP2) as made:
        for name, content in files.items():
            made.writestr(name, content)
    assert refused(other.getvalue())[0].endswith(": is packed in a way that bundles are not")
    for path, what in ((tmp_path / "none.zip", "there is no such file"), (tmp_path, "is a folder")):
        with pytest.raises(InputError, match=what):
            beforehand.receive(path, tmp_path / "got")


def test_every_fault_of_a_bundle_is_told_at_once(
    files: dict[str, bytes], racks: Any, refused: Refused
) -> None:
    """One line each."""
    odd = racks.zipped(racks.listed(files | {"../a": b"", "/b": b"", "C:c": b""}))
    assert refused(odd) == [
        "../a: leads out of the folder",
        "/b: has an absolute path for a name",
        "C:c: has an absolute path for a name",
    ]

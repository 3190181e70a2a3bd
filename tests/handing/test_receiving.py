"""Receiving: nothing overwritten, the plan and its chains read, the lock computed again."""

from __future__ import annotations

import csv
import io
import json
import os
import stat
from pathlib import Path
from typing import Any

import pytest

import beforehand
from beforehand.faults import DataError, InputError, LockError, PlanError, WriteError
from beforehand.handing import MANIFEST, placing, receiving
from beforehand.lock.difference import Replay


def test_there_and_back_again_is_the_same_bytes(racks: Any, plan: Path, bundle: Path, tmp_path: Path) -> None:
    """Every file as it was, and the record computed again byte by byte."""
    done = beforehand.receive(bundle, tmp_path / "got")
    assert (done.replay, done.aside) == (Replay(same_bytes=True, differences=()), ())
    for name in ("racks.plan.yaml", "racks.lock.yaml"):
        assert (tmp_path / "got" / name).read_bytes() == (plan.parent / name).read_bytes()
    files = racks.files_in(bundle)
    assert {name: (tmp_path / "got" / name).read_bytes() for name in files} == files
    assert racks.everything_below(tmp_path / "got") == sorted(files)
    assert beforehand.replay(tmp_path / "got" / "racks.lock.yaml").same_bytes
    umask = os.umask(0)
    os.umask(umask)
    assert stat.S_IMODE((tmp_path / "got").stat().st_mode) == 0o777 & ~umask
    packed_again = tmp_path / "again.zip"
    beforehand.handover(tmp_path / "got" / "racks.plan.yaml", packed_again, with_data=True, labels="shown")
    assert packed_again.read_bytes() == bundle.read_bytes()


@pytest.mark.parametrize("in_lock", ["shown", "hashed"])
@pytest.mark.parametrize("labels", ["shown", "hashed"])
def test_the_record_comes_out_again_however_labels_are_shown(
    in_lock: str, labels: Any, racks: Any, tmp_path: Path
) -> None:
    """Only what rests on labels themselves is set aside, and no key is made at the recipient's."""
    text = racks.PLAN.replace("row_label: rack", f"row_label: rack, labels_in_lock: {in_lock}")
    plan = racks.made_in(tmp_path / "sender", plan=text)
    lock = beforehand.read_lock(plan.parent / "racks.lock.yaml")
    assert lock.rows_removed, "a row has to leave, or labels hardly stand in the lock"
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True, labels=labels)
    files = racks.files_in(tmp_path / "racks.zip")
    assert (b"k041" in files["racks.csv"]) == (labels == "shown")
    assert (b"k041" in files["racks.lock.yaml"]) == (in_lock == "shown")
    done = beforehand.receive(tmp_path / "racks.zip", tmp_path / "got")
    assert done.replay == Replay(same_bytes=True, differences=())
    assert (
        done.aside
        == {
            ("shown", "shown"): (),
            ("hashed", "hashed"): (receiving.FINGERPRINT_ASIDE,),
            ("shown", "hashed"): (receiving.FINGERPRINT_ASIDE, receiving.LABELS_ASIDE),
            ("hashed", "shown"): (receiving.LABELS_ASIDE,),
        }[in_lock, labels]
    )
    assert not (tmp_path / "got" / "racks.labels.key").exists()


def test_rows_without_labels_go_along_too(racks: Any, tmp_path: Path) -> None:
    """Their order is made from their content."""
    plan = racks.made_in(tmp_path / "sender", plan=racks.PLAN.replace(", row_label: rack", ""))
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    files = racks.files_in(tmp_path / "racks.zip")
    assert json.loads(files[MANIFEST])["data"] == {"file": "racks.csv", "labels": "none"}
    assert files["racks.csv"].startswith(b"water,warmth,draught,tray\n")
    assert beforehand.receive(tmp_path / "racks.zip", tmp_path / "got").replay == Replay(
        same_bytes=True, differences=()
    )


def test_a_table_in_a_folder_and_one_that_an_alternative_reads(racks: Any, tmp_path: Path) -> None:
    """Its place is kept, and so are columns that only an alternative names."""
    text = racks.PLAN.replace("racks.csv", "tables/racks.csv") + (
        "  by_tray: {errors: {cluster_by: secret}}\n"
    )
    plan = tmp_path / "sender" / "racks.plan.yaml"
    (plan.parent / "tables").mkdir(parents=True)
    plan.write_text(text, encoding="utf-8")
    table = racks.table_text()
    for place in range(60):
        table = table.replace(f"hidden{place},", f"house{place % 12},")
    (plan.parent / "tables" / "racks.csv").write_text(table, encoding="utf-8")
    beforehand.write_lock(beforehand.run(plan, register=False).lock, plan.parent / "racks.lock.yaml")
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    assert b"house" in racks.files_in(tmp_path / "racks.zip")["tables/racks.csv"]
    (tmp_path / "got").mkdir()
    (tmp_path / "got" / "mine.txt").write_text("mine", encoding="utf-8")
    again = beforehand.receive(tmp_path / "racks.zip", tmp_path / "got").replay
    assert again is not None
    assert again.same_bytes
    assert (tmp_path / "got" / "tables" / "racks.csv").exists()


def test_nothing_is_overwritten(racks: Any, bundle: Path, tmp_path: Path) -> None:
    """Every file in the way is named, and none of the others is written."""
    folder = tmp_path / "got"
    folder.mkdir()
    (folder / "racks.csv").write_text("mine", encoding="utf-8")
    (folder / "manifest.json").symlink_to(tmp_path / "nowhere")
    before = racks.everything_below(tmp_path)
    with pytest.raises(InputError) as caught:
        beforehand.receive(bundle, folder)
    assert str(caught.value).splitlines() == [
        f"{folder / name}: is there already and is left as it is; name another folder"
        for name in ("racks.csv", "manifest.json")
    ]
    assert racks.everything_below(tmp_path) == before
    assert (folder / "racks.csv").read_text(encoding="utf-8") == "mine"
    for odd, what in ((bundle, "it is a file, not a folder"), (tmp_path / "a" / "b", "does not exist")):
        with pytest.raises(WriteError, match=what):
            beforehand.receive(bundle, odd)
    assert racks.everything_below(tmp_path) == before


def test_no_file_is_written_through_a_link(racks: Any, tmp_path: Path) -> None:
    """A folder of the target that leads elsewhere is not followed."""
    sender = tmp_path / "sender"
    (sender / "tables").mkdir(parents=True)
    plan = sender / "racks.plan.yaml"
    plan.write_text(racks.PLAN.replace("racks.csv", "tables/racks.csv"), encoding="utf-8")
    (sender / "tables" / "racks.csv").write_text(racks.table_text(), encoding="utf-8")
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    (tmp_path / "elsewhere").mkdir()
    (tmp_path / "got").mkdir()
    (tmp_path / "got" / "tables").symlink_to(tmp_path / "elsewhere")
    with pytest.raises(InputError, match="would be written through a link"):
        beforehand.receive(tmp_path / "racks.zip", tmp_path / "got")
    assert racks.everything_below(tmp_path / "elsewhere") == []


@pytest.mark.parametrize("there", [True, False])
def test_a_disk_that_fails_leaves_nothing(
    there: bool, racks: Any, bundle: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What was moved is taken back."""
    folder = tmp_path / "got"
    if there:
        folder.mkdir()
    before = racks.everything_below(tmp_path)
    calls: list[Path] = []

    def second(source: Path, target: Path) -> None:
        calls.append(target)
        if len(calls) > 3:
            raise OSError(28, "No space left on device")
        target.hardlink_to(source)

    def rename(self: Path, target: Path) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(placing, "_second_name", second)
    monkeypatch.setattr(Path, "rename", rename)
    with pytest.raises(WriteError, match="no space left on device"):
        beforehand.receive(bundle, folder)
    assert racks.everything_below(tmp_path) == before
    assert len(calls) == (4 if there else 0)


def test_a_bad_plan_lock_or_chain_in_a_good_bundle_leaves_nothing(
    racks: Any, bundle: Path, tmp_path: Path
) -> None:
    """Checksums hold, the content does not; faults name the file in the bundle."""
    files = racks.files_in(bundle)
    trap = tmp_path / "trap.zip"
    plan, lock = files["racks.plan.yaml"], files["racks.lock.yaml"]
    cases = [
        ({"racks.plan.yaml": plan.replace(b"warmth, unit", b"warmth, unite", 1)}, PlanError,
         "racks.plan.yaml:7: predictors[0].unite: is not a key that stands here"),
        ({"racks.plan.yaml": plan.replace(b"clay", b"loam")}, InputError,
         "racks.lock.yaml: plan.whole: is not the record of the plan in the bundle: their digests differ"),
        ({"racks.lock.yaml": lock.replace(b"k041", b"k042")}, LockError,
         "racks.lock.yaml: it was changed after it was written: its digest does not fit"),
        ({"racks.looks": b'{"look": 1}\n'}, LockError, "racks.looks:1: the register of looks is broken"),
        ({"racks.seal.yaml": b"sealed by me\n"}, LockError, "racks.seal.yaml"),
    ]  # fmt: skip
    for change, kind, line in cases:
        trap.write_bytes(racks.zipped(racks.listed(files | change)))
        before = racks.everything_below(tmp_path)
        with pytest.raises(kind) as caught:
            beforehand.receive(trap, tmp_path / "got")
        assert str(caught.value).startswith(f"{trap}: {line}")
        assert racks.everything_below(tmp_path) == before


def test_the_chains_are_asked_for_only_where_they_are(
    racks: Any, plan: Path, bundle: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The seam to the seals: it is given the plan beside which they stand."""
    asked: list[list[str]] = []

    def stub(path: Path) -> None:
        asked.append([path.name, *racks.everything_below(path.parent)])

    monkeypatch.setattr(receiving, "chains_hold", stub)
    assert beforehand.receive(bundle, tmp_path / "unsealed").chains == ()
    assert asked == []
    beforehand.seal(plan, by="the drier", seen="nothing")
    beforehand.write_lock(beforehand.run(plan).lock, plan.parent / "racks.lock.yaml")
    beforehand.handover(plan, tmp_path / "sealed.zip", with_data=True)
    done = beforehand.receive(tmp_path / "sealed.zip", tmp_path / "sealed")
    assert done.chains == ("racks.seal.yaml", "racks.looks")
    assert asked[0][0] == "racks.plan.yaml"
    assert {"racks.seal.yaml", "racks.looks"} <= set(asked[0])


def test_a_sealed_and_amended_plan_comes_out_again(racks: Any, plan: Path, tmp_path: Path) -> None:
    """The first seal is run too, on columns that only it names; no look is added at the recipient's."""
    beforehand.seal(plan, by="the drier", seen="nothing")
    changed = plan.read_text(encoding="utf-8").replace("  - {column: draught, unit: m/s}\n", "")
    plan.write_text(changed, encoding="utf-8")
    beforehand.seal(plan, by="the drier", seen="nothing", amend="The meter of the draught was broken.")
    beforehand.write_lock(beforehand.run(plan).lock, plan.parent / "racks.lock.yaml")
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    files = racks.files_in(tmp_path / "racks.zip")
    assert b"draught" in files["racks.csv"]
    done = beforehand.receive(tmp_path / "racks.zip", tmp_path / "got")
    assert done.replay == Replay(same_bytes=True, differences=())
    assert (tmp_path / "got" / "racks.looks").read_bytes() == files["racks.looks"]


def without_table(plan: Path, output: Path) -> Path:
    """A bundle without the table."""
    beforehand.handover(plan, output)
    return output


def test_the_recipients_own_table_under_other_names(racks: Any, plan: Path, tmp_path: Path) -> None:
    """Its columns have names of their own, one of them a name that the plan has for another."""
    output = without_table(plan, tmp_path / "racks.zip")
    assert beforehand.receive(output, tmp_path / "none").not_replayed == (
        "the bundle holds no table; give one by --data"
    )
    names = {"water": "restwasser", "warmth": "draught", "draught": "zug", "rack": "gestell"}
    rows = list(csv.DictReader(io.StringIO(racks.table_text())))
    table = tmp_path / "eigene.csv"
    with table.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow([names.get(column, column) for column in rows[0]])
        writer.writerows(row.values() for row in rows)
    mapping = tmp_path / "names.yaml"
    mapping.write_text("".join(f"{key}: {value}\n" for key, value in names.items()), encoding="utf-8")
    for number, given in enumerate((names, mapping)):
        done = beforehand.receive(output, tmp_path / f"got{number}", data=table, columns=given)
        assert done.replay == Replay(same_bytes=True, differences=())
        own = beforehand.read_lock(tmp_path / f"got{number}" / done.own_lock)
        assert dict(own.data.columns) == names
        assert own.answer == beforehand.read_lock(tmp_path / f"got{number}" / done.lock).answer
    text = table.read_text(encoding="utf-8")
    table.write_text(text.replace("263.47", "26x").replace("58.125", "61"), encoding="utf-8")
    with pytest.raises(DataError) as caught:
        beforehand.receive(output, tmp_path / "bad", data=table, columns=mapping)
    assert sorted(fault.place for fault in caught.value.faults) == ["draught", "restwasser"]
    assert not (tmp_path / "bad").exists()


def test_names_that_fit_no_column_are_told_with_the_nearest(racks: Any, plan: Path, tmp_path: Path) -> None:
    """Unknown columns, one name for two, no name, no mapping, names without a table."""
    output = without_table(plan, tmp_path / "racks.zip")
    mapping, table = tmp_path / "names.yaml", plan.parent / "racks.csv"

    def lines(text: str) -> list[str]:
        mapping.write_text(text, encoding="utf-8")
        with pytest.raises(InputError) as caught:
            beforehand.receive(output, tmp_path / "got", data=table, columns=mapping)
        assert not (tmp_path / "got").exists()
        return [str(fault).removeprefix(str(mapping)) for fault in caught.value.faults]

    assert lines("watr: x\n") == [":1: watr: is no column that the plan reads (nearest: 'water')"]
    assert lines("water: x\nwarmth: x\n") == [":2: warmth: is 'x', and so is 'water'"]
    assert lines("water:\n") == [":1: water: needs the name of a column of the table"]
    assert lines("water: [a]\n") == [":1: water: needs the name of a column of the table"]
    assert len(lines("- water\n")) == 1
    assert lines("water: warmth\n") == [f"{table}:1: warmth: is read twice: as 'water' and as 'warmth'"]
    assert lines("water: wasser\n") == [f"{table}:1: wasser: the table has no such column (nearest: 'water')"]
    with pytest.raises(InputError, match="other names of columns need a table of their own"):
        beforehand.receive(output, tmp_path / "got", columns={"water": "x"})
    with pytest.raises(InputError, match="there is no such file"):
        beforehand.receive(output, tmp_path / "got", data=table, columns=tmp_path / "none.yaml")


def test_another_table_comes_out_differently(racks: Any, plan: Path, tmp_path: Path) -> None:
    """It is received all the same, and every difference is told."""
    output = without_table(plan, tmp_path / "racks.zip")
    other = tmp_path / "other.csv"
    other.write_text(racks.table_text().replace(racks.UNIQUE, "263.48"), encoding="utf-8")
    done = beforehand.receive(output, tmp_path / "got", data=other)
    assert done.replay is not None
    assert not done.replay.same_bytes
    assert {"data.fingerprint", "answer.r_squared"} <= {one.place for one in done.replay.differences}
    assert (tmp_path / "got" / "racks.lock.yaml").exists()


def test_a_changed_cell_shows_although_labels_are_hashed(racks: Any, plan: Path, tmp_path: Path) -> None:
    """What is set aside hides no number."""
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    files = racks.files_in(tmp_path / "racks.zip")
    files["racks.csv"] = files["racks.csv"].replace(racks.UNIQUE.encode(), b"263.48")
    (tmp_path / "changed.zip").write_bytes(racks.zipped(racks.listed(files)))
    done = beforehand.receive(tmp_path / "changed.zip", tmp_path / "got")
    assert done.replay is not None
    assert "answer.r_squared" in {one.place for one in done.replay.differences}

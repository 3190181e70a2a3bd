"""What goes into a bundle, what never does, and that its bytes are the same every time."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import os
import shutil
import subprocess
import zipfile
from pathlib import Path
from typing import Any

import pytest
import yaml

import beforehand
from beforehand.faults import InputError, WriteError
from beforehand.handing import MANIFEST


def test_a_bundle_has_the_same_bytes_twice_and_in_another_folder(
    racks: Any, plan: Path, tmp_path: Path
) -> None:
    """Neither the time, nor the folder, nor the order of the table's rows is in it."""
    first, second, third = (tmp_path / name for name in ("1.zip", "2.zip", "3.zip"))
    beforehand.handover(plan, first, with_data=True, labels="shown")
    os.utime(plan, (1, 1))
    beforehand.handover(plan, second, with_data=True, labels="shown")
    head, *rows = racks.table_text().splitlines()
    other = racks.made_in(tmp_path / "else" / "where", table="\n".join([head, *reversed(rows)]) + "\n")
    beforehand.handover(other, third, with_data=True, labels="shown")
    assert first.read_bytes() == second.read_bytes() == third.read_bytes()


def test_other_programs_read_it(plan: Path, bundle: Path, tmp_path: Path) -> None:
    """zipfile, hashlib, unzip and sha256sum find it whole and agree on every digest."""
    with zipfile.ZipFile(bundle) as opened:
        assert opened.testzip() is None
        infos = opened.infolist()
        assert [info.filename for info in infos] == sorted(info.filename for info in infos)
        assert {(info.date_time, info.external_attr >> 16, info.create_system) for info in infos} == {
            ((1980, 1, 1, 0, 0, 0), 0o100644, 3)
        }
        assert not any(info.extra or info.comment for info in infos)
        opened.extractall(tmp_path / "out")
    manifest = json.loads((tmp_path / "out" / MANIFEST).read_text(encoding="utf-8"))
    sums: list[str] = []
    for name, member in manifest["members"].items():
        content = (tmp_path / "out" / name).read_bytes()
        assert (hashlib.sha256(content).hexdigest(), len(content)) == (member["sha256"], member["size"])
        sums.append(f"{member['sha256']}  {name}\n")
    if shutil.which("unzip"):
        assert subprocess.run(["unzip", "-tq", bundle], capture_output=True, check=False).returncode == 0
    if shutil.which("sha256sum"):
        done = subprocess.run(
            ["sha256sum", "--check", "--quiet"], input="".join(sums), text=True, cwd=tmp_path / "out",
            capture_output=True, check=False,
        )  # fmt: skip
        assert (done.returncode, done.stdout) == (0, "")


def test_without_the_table_no_value_of_it_is_in_any_member(racks: Any, plan: Path, tmp_path: Path) -> None:
    """Not in the lock, the dictionary or anywhere else; nor is the key, nor a column that nobody reads."""
    output = tmp_path / "racks.zip"
    (plan.parent / "racks.labels.key").write_text("0f" * 32 + "\n", encoding="ascii")
    done = beforehand.handover(plan, output)
    files = racks.files_in(output)
    assert done.data is None
    assert sorted(files) == [
        "READ-ME.txt", "dictionary.yaml", "lock.schema.json", "manifest.json", "plan.schema.json",
        "racks.lock.yaml", "racks.plan.yaml",
    ]  # fmt: skip
    assert racks.UNIQUE in racks.table_text()
    for name, content in files.items():
        assert racks.UNIQUE.encode() not in content, name
        assert b"0f0f0f0f" not in content, name
        assert b"hidden" not in content, name


def test_what_stands_beside_the_plan_goes_along_and_nothing_else(
    racks: Any, plan: Path, tmp_path: Path
) -> None:
    """Rehearsals of any name, refreshes and reports; not another plan's, and not the key."""
    beside = plan.parent
    for name in ("racks.rehearsal.yaml", "racks.rehearsal-noise.yaml", "racks.refresh.yaml",
                 "racks.report.html", "racks.report.docx", "racks.report.md",
                 "racks.refreshed.lock.yaml"):  # fmt: skip
        (beside / name).write_bytes(b"made up\n")
    for name in ("other.rehearsal.yaml", "racks.notes.txt", "racks.labels.key"):
        (beside / name).write_bytes(b"0f" * 32)
    beforehand.seal(plan, by="the drier", seen="nothing")
    beforehand.run(plan)
    lock = beforehand.run(plan, register=False).lock
    beforehand.write_lock(lock, beside / "racks.lock.yaml")
    beforehand.handover(plan, tmp_path / "racks.zip")
    assert {name for name in racks.files_in(tmp_path / "racks.zip") if name.startswith("racks")} == {
        "racks.plan.yaml", "racks.lock.yaml", "racks.seal.yaml", "racks.looks", "racks.rehearsal.yaml",
        "racks.rehearsal-noise.yaml", "racks.refresh.yaml", "racks.report.html", "racks.report.docx",
        "racks.report.md", "racks.refreshed.lock.yaml",
    }  # fmt: skip


def test_the_table_that_goes_along_has_the_plans_columns_and_hashed_labels(
    racks: Any, plan: Path, tmp_path: Path
) -> None:
    """Cells as in the file, rows by label, the label a keyed hash that the unkeyed one does not give."""
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True)
    rows = list(csv.DictReader(io.StringIO(racks.files_in(tmp_path / "racks.zip")["racks.csv"].decode())))
    before = list(csv.DictReader(io.StringIO(racks.table_text())))
    assert list(rows[0]) == ["rack", "water", "warmth", "draught", "tray"]
    for row, old in zip(rows, before, strict=True):
        assert {key: row[key] for key in row if key != "rack"} == {
            key: old[key] for key in row if key != "rack"
        }
        assert len(row["rack"]) == 16
        assert row["rack"] != hashlib.sha256(old["rack"].encode()).hexdigest()[:16]
    assert len({row["rack"] for row in rows}) == 60


def test_cells_of_another_way_of_writing_stay_as_they_are(racks: Any, tmp_path: Path) -> None:
    """Decimal commas, another separator, another encoding, quotes and codes for missing values."""
    head = "data: {file: racks.csv, row_label: rack, separator: ';', decimal: ',', encoding: latin-1, "
    text = racks.PLAN.replace("data: {file: racks.csv, row_label: rack", head + "missing_codes: [fehlt]")
    text = text.replace("[reed, wire]", "['rohr \"ü\"', 'draht; fein']")
    rows = [line.split(",") for line in racks.table_text().splitlines()[1:]]
    lines = ["rack;warmth;draught;tray;secret;water"]
    for place, (rack, warmth, draught, tray, _, water) in enumerate(rows):
        level = '"rohr ""ü"""' if tray == "reed" else '"draht; fein"'
        number = "fehlt" if place == 5 else draught.replace(".", ",")
        lines.append(f"{rack};{warmth.replace('.', ',')};{number};{level};-;{water.replace('.', ',')}")
    folder = tmp_path / "sender"
    folder.mkdir()
    (folder / "racks.csv").write_bytes(("\n".join(lines) + "\n").encode("latin-1"))
    plan = folder / "racks.plan.yaml"
    plan.write_text(text, encoding="utf-8")
    beforehand.write_lock(beforehand.run(plan, register=False).lock, folder / "racks.lock.yaml")
    beforehand.handover(plan, tmp_path / "racks.zip", with_data=True, labels="shown")
    again = beforehand.receive(tmp_path / "racks.zip", tmp_path / "got").replay
    assert again is not None
    assert again.same_bytes


def test_the_dictionary_counts_and_names_and_shows_no_row(racks: Any, plan: Path, tmp_path: Path) -> None:
    """Kinds, units, declared ranges and levels, rows and missing values."""
    beforehand.handover(plan, tmp_path / "racks.zip")
    dictionary = yaml.safe_load(racks.files_in(tmp_path / "racks.zip")["dictionary.yaml"])
    assert dictionary == {
        "dictionary": 1,
        "title": "Drying of clay in a rack (invented)",
        "table": {"file": "racks.csv", "rows": 60, "eligible": 60, "row_label": "rack"},
        "columns": [
            {"column": "water", "use": "outcome", "kind": "number", "unit": "g", "missing": 0},
            {"column": "warmth", "use": "predictor", "kind": "number", "unit": "°C", "range": [0, 60],
             "missing": 0},
            {"column": "draught", "use": "predictor", "kind": "number", "unit": "m/s", "missing": 0},
            {"column": "tray", "use": "predictor", "kind": "category", "baseline": "reed",
             "levels": ["reed", "wire"], "missing": 0},
            {"column": "rack", "use": "row_label", "kind": "text"},
        ],
    }  # fmt: skip


def test_without_a_table_at_hand_a_plan_can_still_be_handed_over(
    racks: Any, plan: Path, tmp_path: Path
) -> None:
    """The dictionary then counts nothing."""
    (plan.parent / "racks.csv").unlink()
    beforehand.handover(plan, tmp_path / "racks.zip")
    dictionary = yaml.safe_load(racks.files_in(tmp_path / "racks.zip")["dictionary.yaml"])
    assert dictionary["table"] == {"file": "racks.csv", "row_label": "rack"}


def refusal(plan: Path, output: Path, **asked: Any) -> list[str]:
    """The lines of a refusal; nothing is written."""
    before = output.read_bytes() if output.exists() else None
    with pytest.raises(InputError) as caught:
        beforehand.handover(plan, output, **asked)
    assert (output.read_bytes() if output.exists() else None) == before
    return str(caught.value).replace(str(plan.parent), "@").splitlines()


def test_what_cannot_be_handed_over_is_refused(racks: Any, plan: Path, tmp_path: Path) -> None:
    """Rows in a share-safe bundle, a stale lock, another table, a label that the plan computes with."""
    output = tmp_path / "racks.zip"
    assert refusal(plan, output, with_data=True, share_safe=True) == [
        "@/racks.plan.yaml: share_safe: a share-safe bundle holds no rows: leave out the one or the other"
    ]
    table = plan.parent / "racks.csv"
    table.write_text(racks.table_text(seed=7), encoding="utf-8")
    assert refusal(plan, output, with_data=True) == [
        "@/racks.lock.yaml: data: is not the record of racks.csv as it is: give its own table by --data, "
        "or run again"
    ]
    plan.write_text(racks.PLAN.replace("invented", "made up"), encoding="utf-8")
    assert refusal(plan, output) == [
        "@/racks.lock.yaml: plan: is the record of another plan than racks.plan.yaml is now: run it again"
    ]
    (plan.parent / "racks.lock.yaml").unlink()
    assert refusal(plan, output, share_safe=True) == [
        "@/racks.plan.yaml: share_safe: there is no racks.lock.yaml: run the plan first"
    ]
    ordered = racks.PLAN + "assumptions: {independence: {test: breusch_godfrey, in_order_of: rack}}\n"
    plan.write_text(ordered, encoding="utf-8")
    assert refusal(plan, output, with_data=True) == [
        "@/racks.plan.yaml: assumptions.independence.in_order_of: the row label 'rack' is used by the plan "
        "itself, so it cannot be hashed: hand it over shown"
    ]
    table.unlink()
    assert refusal(plan, output, with_data=True) == ["@/racks.csv: there is no such file"]


def test_only_an_earlier_bundle_is_replaced(plan: Path, bundle: Path, tmp_path: Path) -> None:
    """A file that a person may have written stays, and so does a zip of something else."""
    beforehand.handover(plan, bundle)
    other = tmp_path / "photos.zip"
    with zipfile.ZipFile(other, "w") as made:
        made.writestr("rack.png", b"-")
    for mine in (plan, other):
        before = mine.read_bytes()
        with pytest.raises(WriteError, match="is not a bundle and is left as it is"):
            beforehand.handover(plan, mine)
        assert mine.read_bytes() == before
    with pytest.raises(WriteError, match="its folder does not exist"):
        beforehand.handover(plan, tmp_path / "nowhere" / "racks.zip")


def test_two_files_of_one_name_are_not_packed(racks: Any, tmp_path: Path) -> None:
    """A table that is called like a file of the bundle is told, not lost."""
    plan = racks.made_in(tmp_path / "sender")
    table = plan.parent / "Dictionary.yaml"
    (plan.parent / "racks.csv").rename(table)
    plan.write_text(racks.PLAN.replace("racks.csv", table.name), encoding="utf-8")
    (plan.parent / "racks.lock.yaml").unlink()
    assert refusal(plan, tmp_path / "racks.zip", with_data=True) == [
        "@/racks.plan.yaml: dictionary.yaml: is 'Dictionary.yaml' in other letters"
    ]

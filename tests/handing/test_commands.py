"""The two commands as they are typed."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Invoke = Callable[..., Any]


def test_handing_over_and_receiving(
    invoke: Invoke, plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Both say what they did; the digest that is to be told is that of the file."""
    import hashlib

    monkeypatch.chdir(tmp_path)
    done = invoke("handover", plan, "-o", "racks.zip", "--with-data")
    assert (done.exit_code, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert lines[0] == "Packed: racks.zip, 8 files"
    assert f"  SHA-256 {hashlib.sha256(Path('racks.zip').read_bytes()).hexdigest()}" in lines
    assert (
        "  racks.csv went along: 60 rows, the columns that the plan names; row labels are keyed hashes."
        in (lines)
    )
    got = invoke("receive", "racks.zip", "-d", "got")
    assert (got.exit_code, got.stderr) == (0, "")
    assert got.stdout == (
        "Received: got\n"
        "  Packed by beforehand 0.1.0. Each of 7 files has the size and the checksum of the manifest.\n"
        "  racks.plan.yaml can be read and has no fault.\n"
        "  The plan is not sealed, so the bundle cannot show that it came first.\n"
        "\n"
        "Same: racks.lock.yaml\n"
        "  Every byte of the record comes out again.\n"
        "  Not compared: the table's fingerprint, which is taken over the labels themselves; row labels and\n"
        "  digests of them, since a hash cannot be made again without its key.\n"
    )


def test_a_difference_ends_with_3(racks: Any, invoke: Invoke, plan: Path, tmp_path: Path) -> None:
    """The bundle is received, and each difference has its line."""
    bundle = tmp_path / "racks.zip"
    assert invoke("handover", plan, "-o", bundle).exit_code == 0
    other = tmp_path / "other.csv"
    other.write_text(racks.table_text().replace(racks.UNIQUE, "263.48"), encoding="utf-8")
    done = invoke("receive", bundle, "-d", tmp_path / "got", "--data", other)
    assert (done.exit_code, done.stderr) == (3, "")
    assert "\nDifferent: racks.lock.yaml, " in done.stdout
    assert (tmp_path / "got" / "racks.plan.yaml").exists()


def test_a_fault_ends_with_2_and_one_line(invoke: Invoke, plan: Path, tmp_path: Path) -> None:
    """Nothing on standard output, nothing written."""
    bundle = tmp_path / "racks.zip"
    bundle.write_bytes(b"PK no")
    done = invoke("receive", bundle, "-d", tmp_path / "got")
    assert (done.exit_code, done.stdout, done.stderr) == (
        2, "", f"{bundle}: is cut short, or no bundle: it does not end as one\n",
    )  # fmt: skip
    assert not (tmp_path / "got").exists()
    done = invoke("handover", plan, "-o", bundle)
    assert (done.exit_code, done.stderr) == (
        2, f"{bundle}: is not a bundle and is left as it is; name another file\n",
    )  # fmt: skip


def test_results_for_programs_have_stable_keys(invoke: Invoke, plan: Path, tmp_path: Path) -> None:
    """The keys are a promise."""
    bundle = tmp_path / "racks.zip"
    packed = json.loads(invoke("handover", plan, "-o", bundle, "--share-safe", "--json").stdout)
    assert list(packed) == ["bundle", "sha256", "members", "data", "rows", "share_safe", "cautions"]
    assert packed["data"] is None
    packed = json.loads(
        invoke("handover", plan, "-o", bundle, "--with-data", "--labels", "shown", "--json").stdout
    )
    assert (packed["data"], packed["rows"]) == ({"file": "racks.csv", "labels": "shown"}, 60)
    got = json.loads(invoke("receive", bundle, "-d", tmp_path / "got", "--json").stdout)
    assert list(got) == [
        "folder",
        "program",
        "plan",
        "members",
        "chains",
        "lock",
        "safe",
        "replay",
        "aside",
        "not_replayed",
        "own_lock",
    ]
    assert got["replay"] == {"same": True, "same_bytes": True, "differences": []}


def test_texts_for_a_sealed_and_for_a_share_safe_bundle(
    invoke: Invoke, plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What holds, and why nothing was computed again."""
    monkeypatch.chdir(tmp_path)
    assert invoke("seal", plan, "--by", "the drier", "--seen", "nothing").exit_code == 0
    assert invoke("run", plan).exit_code == 0
    assert invoke("handover", plan, "-o", "racks.zip", "--share-safe").exit_code == 0
    done = invoke("receive", "racks.zip", "-d", "got")
    assert done.exit_code == 0
    assert "  Every link holds: racks.seal.yaml, racks.looks.\n" in done.stdout
    assert done.stdout.endswith("Not computed again\n  A share-safe copy cannot be replayed.\n")

"""The same plan and data give the same bytes, whatever order, threads, kernel or day."""

from __future__ import annotations

import gzip
import os
import random
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import yaml

from beforehand.api import lock_text, read_plan, run

PLANS = Path(__file__).parents[1] / "plans"
READY = sorted(PLANS.glob("*/*.plan.yaml"))


def copied(plan: Path, folder: Path) -> Path:
    """A ready plan with its tables in a folder of its own."""
    shutil.copytree(plan.parent, folder, dirs_exist_ok=True)
    return folder / plan.name


def locked(plan: Path) -> str:
    """The lock of a plan, without the environment (which the digest leaves out too)."""
    return lock_text(run(read_plan(plan)).lock).partition("\nenvironment:")[0]


@pytest.fixture(params=READY, ids=lambda path: path.parent.name)
def ready(request):
    """Each ready plan in turn."""
    return request.param


def test_shuffled_rows_and_columns_change_nothing(ready, tmp_path):
    """Rows, columns and an added unused column leave the bytes alone."""
    plan = copied(ready, tmp_path)
    before = locked(plan)
    table = tmp_path / read_plan(plan).data.file
    header, *rows = [line.split(",") for line in table.read_text(encoding="utf-8").splitlines()]
    rng = random.Random(5)
    places = list(range(len(header)))
    rng.shuffle(places)
    rng.shuffle(rows)
    lines = [[*(row[place] for place in places), "unused"] for row in [header, *rows]]
    table.write_text("\n".join(",".join(line) for line in lines) + "\n", encoding="utf-8")
    assert locked(plan) == before


def test_unlabelled_rows_may_be_shuffled_too(tmp_path):
    """Without a label column rows are numbered in an order of their own, so shuffling changes nothing."""
    plan = copied(PLANS / "repair-bench" / "jobs.plan.yaml", tmp_path)
    plan.write_text(plan.read_text(encoding="utf-8").replace("  row_label: job\n", ""), encoding="utf-8")
    before = locked(plan)
    table = tmp_path / "jobs-q1.csv"
    header, *rows = table.read_text(encoding="utf-8").splitlines()
    random.Random(6).shuffle(rows)
    table.write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")
    assert locked(plan) == before


def test_reordered_keys_comments_and_quotes_change_nothing(ready, tmp_path):
    """Key order, comments, quoting and white space of the plan leave the bytes alone."""
    plan = copied(ready, tmp_path)
    before = locked(plan)
    data = yaml.safe_load(plan.read_text(encoding="utf-8"))
    turned = dict(reversed(list(data.items())))
    plan.write_text(
        "# another comment\n" + yaml.safe_dump(turned, sort_keys=False, allow_unicode=True), encoding="utf-8"
    )
    assert locked(plan) == before


def test_gzip_and_line_ends_change_nothing(ready, tmp_path):
    """A gzipped table, or one with CRLF line ends, gives the same lock."""
    plan = copied(ready, tmp_path)
    before = locked(plan)
    table = tmp_path / read_plan(plan).data.file
    content = table.read_bytes().replace(b"\n", b"\r\n")
    table.write_bytes(gzip.compress(content))
    assert locked(plan) == before


@pytest.mark.parametrize(
    "environment",
    [
        {"OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1"},
        {"OPENBLAS_NUM_THREADS": "2", "OMP_NUM_THREADS": "2"},
        {"OPENBLAS_CORETYPE": "Nehalem"},
        {"OPENBLAS_CORETYPE": "Haswell"},
        {"NPY_DISABLE_CPU_FEATURES": "AVX2 FMA3 AVX512F"},
        {"PYTHONHASHSEED": "1"},
        {"PYTHONHASHSEED": "2", "TZ": "Asia/Tokyo", "LC_ALL": "C"},
    ],
    ids=lambda environment: " ".join(f"{key}={value}" for key, value in environment.items()),
)
def test_threads_kernels_and_hash_seeds_change_nothing(environment, tmp_path):
    """Threads, BLAS kernels, vector instructions and hash seeds leave the bytes alone."""
    plan = copied(PLANS / "cold-rooms" / "cold-rooms.plan.yaml", tmp_path)
    out = tmp_path / "other.lock.yaml"
    subprocess.run(
        [sys.executable, "-W", "ignore", "-m", "beforehand.cli", "run", str(plan), "-o", str(out), "--quiet"],
        check=True,
        env={**os.environ, **environment},
        capture_output=True,
    )
    assert out.read_text(encoding="utf-8").partition("\nenvironment:")[0] == locked(plan)


def test_a_large_table_gives_the_same_bytes_in_any_order_and_block(tmp_path, monkeypatch):
    """50,000 rows with outliers: shuffled, and in blocks of another size, the same lock."""
    import pandas as pd

    from beforehand.api import plan_from_mapping
    from beforehand.fit import linear, moments

    rng = np.random.default_rng(8)
    values = rng.normal(size=(50_000, 6)) * np.array([1, 1e3, 1e-3, 5, 5, 5]) + np.array([0, 1e6, 0, 2, 2, 9])
    frame = pd.DataFrame(values, columns=list("abcdef"))
    frame["c"] = np.exp(frame["c"] * 400)
    frame["y"] = 3 * frame["a"] + 2e-3 * frame["b"] + frame["c"] + rng.standard_t(4, size=len(frame))
    plan = plan_from_mapping(
        {
            "language": 1,
            "title": "Many rows",
            "question": "Same bytes?",
            "data": {"file": "many.csv"},
            "outcome": {"column": "y"},
            "predictors": [{"column": name} for name in "abcdef"],
        }
    )
    before = lock_text(run(plan, frame).lock)
    monkeypatch.setattr(moments, "BLOCK_ROWS", 777)
    monkeypatch.setattr(linear, "BLOCK_CELLS", 9_000)
    shuffled = frame.sample(frac=1.0, random_state=3)
    assert lock_text(run(plan, shuffled).lock) == before


@pytest.mark.parametrize("plan", READY, ids=lambda path: path.parent.name)
def test_committed_locks_replay_to_the_byte(plan):
    """The lock beside each ready plan is what a run gives today."""
    lock = plan.with_name(plan.name.replace(".plan.yaml", ".lock.yaml"))
    assert lock.read_text(encoding="utf-8").partition("\nenvironment:")[0] == locked(plan)

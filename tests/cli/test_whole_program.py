"""The program as a person uses it: a table, a draft, a check, a run, a trace, a replay."""

from __future__ import annotations

import json
import random
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from rich.cells import cell_len

Command = Callable[..., Any]

PLAN = """\
language: 1
title: Drying of clay in a rack (invented)
question: Which conditions of a rack go with the water that is left after a night?
data: {file: racks.csv, row_label: rack}
outcome: {column: water, unit: g}
predictors:
  - {column: warmth, unit: °C, role: focal}
  - {column: draught, unit: m/s}
  - {column: tray, kind: category, levels: [reed, wire]}
  - {column: moon, unit: share}
keep:
  - {predictor: warmth, rule: always, because: Warm air takes up more water., expected_sign: negative}
alternatives:
  stricter: {alpha: 0.01}
"""


@pytest.fixture(scope="module")
def made() -> tuple[str, str]:
    """The plan and an invented table of 120 racks, drawn with a fixed seed."""
    draw = random.Random(20261201)
    lines = ["rack,warmth,draught,tray,moon,water"]
    for place in range(120):
        warmth, draught, moon = draw.uniform(8, 24), draw.uniform(0, 3), draw.random()
        tray = draw.choice(["reed", "wire"])
        water = 400 - 9.5 * warmth - 21 * draught - 14 * (tray == "wire") + draw.gauss(0, 18)
        lines.append(f"k{place:03d},{warmth:.2f},{draught:.3f},{tray},{moon:.3f},{water:.2f}")
    return PLAN, "\n".join(lines) + "\n"


@pytest.fixture
def folder(tmp_path: Path, made: tuple[str, str]) -> Path:
    """A folder with plan and table."""
    plan, table = made
    (tmp_path / "racks.plan.yaml").write_text(plan, encoding="utf-8")
    (tmp_path / "racks.csv").write_text(table, encoding="utf-8")
    return tmp_path


def test_a_day_with_it(command: Command, folder: Path) -> None:
    """Draft, check, run, trace, replay: each ends with 0 and prints where it should."""
    drafted = command("draft", "racks.csv", "--outcome", "water", "-o", "drafted.plan.yaml", cwd=folder)
    assert (drafted.returncode, drafted.stdout) == (0, "")
    assert command("check", "drafted.plan.yaml", cwd=folder).returncode == 0
    checked = command("check", "racks.plan.yaml", cwd=folder)
    assert (checked.returncode, checked.stderr) == (0, "")
    assert checked.stdout.startswith("racks.plan.yaml can be run\n")
    run = command("run", "racks.plan.yaml", cwd=folder)
    assert (run.returncode, run.stderr) == (0, "")
    assert "Adopted: the model stands" in run.stdout
    assert "water goes down by" in run.stdout
    assert "beforehand replay racks.lock.yaml" in run.stdout
    traced = command("trace", "racks.lock.yaml", "moon", cwd=folder)
    assert (traced.returncode, traced.stderr) == (0, "")
    assert traced.stdout.startswith("moon: removed\n")
    replayed = command("replay", "racks.lock.yaml", cwd=folder)
    assert (replayed.returncode, replayed.stdout, replayed.stderr) == (
        0,
        "Same: racks.lock.yaml\n  Every byte of the record comes out again.\n",
        "",
    )


def test_other_data_come_out_differently(command: Command, folder: Path) -> None:
    """A changed table ends a replay with 3 and names the places."""
    assert command("run", "racks.plan.yaml", "--quiet", cwd=folder).returncode == 0
    table = (folder / "racks.csv").read_text(encoding="utf-8").split("\n")
    (folder / "other.csv").write_text("\n".join(table[:-2]) + "\n", encoding="utf-8")
    done = command("replay", "racks.lock.yaml", "--data", "other.csv", cwd=folder)
    assert (done.returncode, done.stderr) == (3, "")
    assert "data.rows: 120 before, 119 now" in done.stdout


def test_faults_are_lines_and_nothing_is_written(command: Command, folder: Path) -> None:
    """All faults at once on standard error, exit 2, no record."""
    plan = folder / "racks.plan.yaml"
    text = plan.read_text(encoding="utf-8").replace("column: draught", "column: draft")
    plan.write_text(text.replace("stricter: {alpha: 0.01}", "stricter: {alhpa: 0.01}"), encoding="utf-8")
    done = command("run", "racks.plan.yaml", cwd=folder)
    assert (done.returncode, done.stdout) == (2, "")
    lines = done.stderr.rstrip("\n").split("\n")
    assert lines
    assert all(line.startswith(("racks.plan.yaml:", "racks.csv")) for line in lines)
    assert not (folder / "racks.lock.yaml").exists()


def test_the_json_of_a_check_has_stable_keys(command: Command, folder: Path) -> None:
    """For editors and pipelines."""
    result = json.loads(command("check", "racks.plan.yaml", "--json", "--full", cwd=folder).stdout)
    assert list(result) == ["usable", "cautions", "review", "plan"]
    assert result["plan"]["alpha"] == 0.05


def test_a_plan_is_written_out_with_its_defaults(command: Command, folder: Path) -> None:
    """What ``--full`` prints is a plan again, with the same meaning."""
    full = command("check", "racks.plan.yaml", "--full", cwd=folder)
    assert (full.returncode, full.stderr) == (0, "")
    (folder / "full.plan.yaml").write_text(full.stdout, encoding="utf-8")
    again = command("check", "full.plan.yaml", "--full", cwd=folder)
    assert again.stdout == full.stdout


def test_a_run_needs_no_heavy_library(environment: dict[str, str], folder: Path) -> None:
    """pandas, statsmodels and scipy.stats stay outside a run of a small plan."""
    code = (
        "import sys\nfrom beforehand.cli import main\n"
        "sys.argv = ['beforehand', 'run', 'racks.plan.yaml', '--quiet']\n"
        "try:\n    main()\nexcept SystemExit as end:\n    assert not end.code, end.code\n"
        "print([n for n in ('pandas', 'statsmodels', 'scipy.stats') if n in sys.modules])\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        cwd=folder,
        env=environment,
        capture_output=True,
        text=True,
        check=False,
    )
    assert (done.returncode, done.stdout, done.stderr) == (0, "[]\n", "")


@pytest.mark.parametrize("columns", ["60", "80", "100", "120"])
def test_the_answer_fits_the_screen(columns: str, command: Command, folder: Path) -> None:
    """COLUMNS is kept to, and one screen is enough for a small plan."""
    done = command("run", "racks.plan.yaml", cwd=folder, env={"COLUMNS": columns})
    lines = done.stdout.split("\n")
    assert done.returncode == 0
    assert max(map(cell_len, lines)) <= int(columns)
    if columns == "100":
        assert len(lines) <= 50


@pytest.mark.skipif(sys.platform == "win32", reason="signals are others there")
def test_an_interrupt_leaves_nothing_behind(environment: dict[str, str], folder: Path) -> None:
    """Control-C in the middle of a run: one line, 130, no file."""
    code = (
        "import sys, time, beforehand.api as api\n"
        "from beforehand.cli import main\n"
        "def run(*args, **options):\n    print('started', flush=True)\n    time.sleep(30)\n"
        "api.run = run\n"
        "sys.argv = ['beforehand', 'run', 'racks.plan.yaml']\n"
        "main()\n"
    )
    before = sorted(folder.iterdir())
    process = subprocess.Popen(
        [sys.executable, "-c", code],
        cwd=folder,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    assert process.stdout is not None
    assert process.stdout.readline() == "started\n"
    time.sleep(0.1)
    process.send_signal(signal.SIGINT)
    _, told = process.communicate(timeout=30)
    assert (process.returncode, told) == (130, "interrupted; nothing was written\n")
    assert sorted(folder.iterdir()) == before

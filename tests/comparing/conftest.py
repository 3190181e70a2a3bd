"""A small invented plan about a pump and ways to change it; a folder of racks, under git where wanted."""

from __future__ import annotations

import copy
import os
import random
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import beforehand
from beforehand.comparing import Change, plan_changes
from beforehand.plan import Plan, plan_from_mapping

PUMP: dict[str, Any] = {
    "language": 1,
    "title": "Power of a pump",
    "question": "What goes with the power of the pump?",
    "data": {"file": "pump.csv", "row_label": "reading"},
    "eligibility": [
        {"column": "phase", "is": "in use", "because": "Trials do not count."},
        {"column": "hour", "at_least": 6, "because": "Nights are for cleaning."},
        {"column": "hour", "at_most": 22, "because": "Nights are for cleaning."},
    ],
    "derive": [{"column": "lift", "from": "pressure * 10", "unit": "m"}],
    "outcome": {"column": "power", "unit": "kW", "range": [0, 400]},
    "predictors": [
        {"column": "flow", "unit": "l/s", "range": [0, 200], "role": "focal"},
        {"column": "lift", "unit": "m"},
        {"column": "age", "unit": "year"},
        {"column": "site", "kind": "category", "levels": ["east", "west", "north"]},
    ],
    "products": [["flow", "lift"]],
    "keep": [
        {"predictor": "flow", "rule": "always", "because": "Work done.", "expected_sign": "positive"},
        {"predictor": "age", "rule": {"unless_p_above": 0.2}, "because": "Wear."},
        {"at_least_one_of": ["lift", "site"], "because": "Height counts."},
    ],
    "expects": {"residual_sd": 10, "slopes": {"flow": 1.5}},
    "alternatives": {"stricter": {"alpha": 0.01}},
}

Edit = Callable[[dict[str, Any]], object]


def edited(edit: Edit) -> Plan:
    """The plan of the pump after an edit of its data."""
    data = copy.deepcopy(PUMP)
    edit(data)
    return plan_from_mapping(data)


def changes_of(edit: Edit) -> tuple[Change, ...]:
    """What the edit changes, as the program sees it."""
    return plan_changes(plan_from_mapping(PUMP), edited(edit))


@pytest.fixture
def pump() -> Plan:
    """The plan of the pump."""
    return plan_from_mapping(PUMP)


@pytest.fixture
def changes() -> Callable[[Edit], tuple[Change, ...]]:
    """What an edit of the pump's plan changes, as the program sees it."""
    return changes_of


@pytest.fixture
def make() -> Callable[[Edit], Plan]:
    """The pump's plan after an edit."""
    return edited


@pytest.fixture
def pump_data() -> dict[str, Any]:
    """The pump's plan as plain data, free to change."""
    return copy.deepcopy(PUMP)


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
alpha: 0.05
"""
Command = Callable[..., "subprocess.CompletedProcess[str]"]


@pytest.fixture(scope="session")
def racks_table() -> str:
    """An invented table of 80 racks, drawn with a fixed seed."""
    draw = random.Random(20261201)
    lines = ["rack,warmth,draught,tray,moon,water"]
    for place in range(80):
        warmth, draught, moon = draw.uniform(8, 24), draw.uniform(0, 3), draw.random()
        tray = draw.choice(["reed", "wire"])
        water = 400 - 9.5 * warmth - 21 * draught - 14 * (tray == "wire") + draw.gauss(0, 18)
        lines.append(f"k{place:03d},{warmth:.2f},{draught:.3f},{tray},{moon:.3f},{water:.2f}")
    return "\n".join(lines) + "\n"


@pytest.fixture
def racks(tmp_path: Path, racks_table: str) -> Path:
    """A folder with the plan of the racks and its table."""
    folder = tmp_path / "racks"
    folder.mkdir()
    (folder / "racks.plan.yaml").write_text(PLAN, encoding="utf-8")
    (folder / "racks.csv").write_text(racks_table, encoding="utf-8")
    return folder


@pytest.fixture
def git(racks: Path) -> Callable[..., str]:
    """The folder of the racks under git, with a first state on ``main``; runs git in it."""
    names = {"GIT_AUTHOR_NAME": "a", "GIT_COMMITTER_NAME": "a"}
    mails = {"GIT_AUTHOR_EMAIL": "a@invented.example", "GIT_COMMITTER_EMAIL": "a@invented.example"}
    # Nothing of the settings of whoever runs the tests.
    own = {"GIT_CONFIG_GLOBAL": os.devnull, "GIT_CONFIG_SYSTEM": os.devnull}

    def run(*args: str, env: dict[str, str] | None = None) -> str:
        settings = os.environ | names | mails | own | (env or {})
        done = subprocess.run(
            ["git", *args], cwd=racks, env=settings, capture_output=True, text=True, check=True
        )
        return done.stdout

    run("init", "-q", "-b", "main")
    run("add", ".")
    run("commit", "-q", "-m", "The plan as first written")
    return run


@pytest.fixture
def environment() -> dict[str, str]:
    """The environment of the tests, with this very source in it."""
    steering = ("COLUMNS", "NO_COLOR", "BEFOREHAND_TRACEBACK")
    clean = {key: value for key, value in os.environ.items() if key not in steering}
    return clean | {"PYTHONPATH": str(Path(beforehand.__file__).parents[1]), "PYTHONIOENCODING": "utf-8"}


@pytest.fixture
def command(environment: dict[str, str], racks: Path) -> Command:
    """Run the program as a process of its own, in the folder of the racks."""

    def run(
        *args: object, env: dict[str, str] | None = None, cwd: Path = racks
    ) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "beforehand.cli", *map(str, args)],
            cwd=cwd,
            env=environment | (env or {}),
            capture_output=True,
            text=True,
            encoding="utf-8",
            timeout=60,
            check=False,
        )

    return run

"""The command line in a process of this one, with what it calls replaced; and as a process of its own."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest
from typer.testing import CliRunner

import beforehand
from beforehand.cli.app import app
from beforehand.lock import Lock

HIVES = Path(__file__).parents[1] / "screen" / "hives.lock.json"
SOURCE = Path(beforehand.__file__).parents[1]
Invoke = Callable[..., Any]


@pytest.fixture
def lock() -> Lock:
    """The hand-made lock of the hives."""
    return Lock.model_validate_json(HIVES.read_text(encoding="utf-8"))


@pytest.fixture
def plain_lock() -> dict[str, Any]:
    """The same as plain data."""
    data: dict[str, Any] = json.loads(HIVES.read_text(encoding="utf-8"))
    return data


@pytest.fixture
def api(monkeypatch: pytest.MonkeyPatch) -> SimpleNamespace:
    """What the commands call, empty until a test fills it."""
    stub = SimpleNamespace()
    monkeypatch.setitem(sys.modules, "beforehand.api", stub)
    monkeypatch.setattr(beforehand, "api", stub, raising=False)
    return stub


@pytest.fixture
def invoke(monkeypatch: pytest.MonkeyPatch) -> Invoke:
    """Run a command in this process, on a screen of 100 cells."""
    monkeypatch.setenv("COLUMNS", "100")
    runner = CliRunner()
    return lambda *args: runner.invoke(app, [str(arg) for arg in args])


@pytest.fixture
def environment() -> dict[str, str]:
    """The environment of the tests without what steers the program, with this very source in it."""
    steering = ("COLUMNS", "NO_COLOR", "BEFOREHAND_TRACEBACK")
    clean = {key: value for key, value in os.environ.items() if key not in steering}
    return clean | {"PYTHONPATH": str(SOURCE), "PYTHONIOENCODING": "utf-8"}


@pytest.fixture
def command(environment: dict[str, str]) -> Callable[..., subprocess.CompletedProcess[str]]:
    """Run the program as a process of its own."""

    def run(
        *args: object, env: dict[str, str] | None = None, **options: Any
    ) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "beforehand.cli", *map(str, args)],
            env=environment | (env or {}),
            capture_output=True,
            text=True,
            encoding="utf-8",
            timeout=60,
            check=False,
            **options,
        )

    return run

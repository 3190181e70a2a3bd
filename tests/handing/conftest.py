"""The racks, run and packed; and the command line."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

import beforehand


@pytest.fixture(scope="session")
def racks() -> ModuleType:
    """The module of the racks beside this one."""
    spec = importlib.util.spec_from_file_location("handing_racks", Path(__file__).with_name("racks.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture
def plan(racks: Any, tmp_path: Path) -> Path:
    """The plan of the racks, run."""
    made: Path = racks.made_in(tmp_path / "sender")
    return made


@pytest.fixture
def bundle(plan: Path, tmp_path: Path) -> Path:
    """The same, packed with its table and with labels shown."""
    output = tmp_path / "racks.zip"
    beforehand.handover(plan, output, with_data=True, labels="shown")
    return output


Invoke = Callable[..., Any]


@pytest.fixture
def invoke(monkeypatch: pytest.MonkeyPatch) -> Invoke:
    """Run a command in this process, on a screen of 100 cells."""
    from typer.testing import CliRunner

    from beforehand.cli.app import app

    monkeypatch.setenv("COLUMNS", "100")
    runner = CliRunner()
    return lambda *args: runner.invoke(app, [str(arg) for arg in args])

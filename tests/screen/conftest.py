"""A hand-made lock of an invented run: honey of hives along a valley."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from beforehand.lock import Lock

HERE = Path(__file__).parent


@pytest.fixture
def hives() -> dict[str, Any]:
    """The lock as plain data, to be changed freely by a test."""
    data: dict[str, Any] = json.loads((HERE / "hives.lock.json").read_text(encoding="utf-8"))
    return data


@pytest.fixture
def lock_of() -> Callable[[dict[str, Any]], Lock]:
    """Make the lock of plain data, checked like one that is read from a file."""
    return lambda data: Lock.model_validate_json(json.dumps(data))

"""Makes the shared cases importable by the name under which tests ask for them."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path

_spec = importlib.util.spec_from_file_location("tests_cases", Path(__file__).with_name("cases.py"))
assert _spec is not None
assert _spec.loader is not None
_module = importlib.util.module_from_spec(_spec)
sys.modules["tests_cases"] = _module
_spec.loader.exec_module(_module)

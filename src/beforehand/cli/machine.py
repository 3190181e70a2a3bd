"""Results as JSON for programs: stable keys in a stable order, and never NaN."""

from __future__ import annotations

import dataclasses
import json
import math
from collections.abc import Mapping
from typing import Any


def json_text(value: Any) -> str:
    """Plain data, frozen records or mappings of them as indented JSON that ends in a newline."""
    return json.dumps(plain(value), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def plain(value: Any) -> Any:
    """The same as dicts, lists, texts and numbers; what is not a finite number becomes null."""
    if value is None or isinstance(value, bool | int | str):
        return value
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if hasattr(value, "model_dump"):
        return plain(value.model_dump(by_alias=True))
    raise TypeError(f"no JSON for {type(value).__name__}")

"""Rungs of the ladder as they stand beside a name in a picture."""

from __future__ import annotations

from collections.abc import Mapping

_SIGNS: Mapping[str, str] = {
    "square": "squared",
    "cube": "cubed",
    "square_root": "√",
    "cube_root": "∛",
    "log": "log",
    "reciprocal": "1/x",
    "box_cox": "power",
}

_UNDER: Mapping[str, str] = {
    "identity": "{}",
    "square": "{}²",
    "cube": "{}³",
    "square_root": "√{}",
    "cube_root": "∛{}",
    "log": "log {}",
    "reciprocal": "1/{}",
    "box_cox": "power of {}",
}


def rung_sign(rung: str) -> str:
    """A rung in a few letters."""
    return _SIGNS.get(rung, rung.replace("_", " "))


def under(name: str, rung: str | None) -> str:
    """A name under a rung, as arithmetic is written."""
    return name if rung is None else _UNDER.get(rung, "{}").format(name)

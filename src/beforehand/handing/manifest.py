"""The manifest of a bundle: what it holds, with the size and digest of each member."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from beforehand.faults import Fault, InputError

MANIFEST = "manifest.json"
BUNDLE_VERSION = 1

_KEPT_FROM_A_FAULT = 5


class _Part(BaseModel):
    """A frozen part of a manifest; nothing is coerced and nothing unknown is let in."""

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True)


class Member(_Part):
    """One file of a bundle."""

    sha256: Annotated[str, Field(pattern=r"^[0-9a-f]{64}$")]
    size: Annotated[int, Field(ge=0)]


class Rows(_Part):
    """The table in a bundle."""

    file: str
    labels: Literal["shown", "hashed", "none"]


class Manifest(_Part):
    """What stands in ``manifest.json``.

    Attributes
    ----------
    bundle : int
        Version of the layout.
    program : str
        The program that packed it, with its version.
    plan : str
        Name of the plan.
    lock, safe : str or None
        Name of the lock, or of the copy of it that gives no row away.
    data : Rows or None
        The table, where it goes along.
    members : mapping of str to Member
        Every other file, by its name.
    """

    bundle: Literal[1]
    program: str
    plan: str
    lock: str | None
    safe: str | None
    data: Rows | None
    members: Mapping[str, Member]

    def text(self) -> str:
        """The manifest as it stands in its file."""
        return json.dumps(self.model_dump(), indent=2, ensure_ascii=False) + "\n"


def read_manifest(content: bytes, bundle: str) -> Manifest:
    """The manifest of a bundle from its bytes.

    Parameters
    ----------
    content : bytes
    bundle : str
        How faults name the bundle.

    Raises
    ------
    InputError
        It is of another version, or no manifest.
    """
    try:
        data = json.loads(content.decode("utf-8"), object_pairs_hook=_once)
    except (UnicodeDecodeError, ValueError, RecursionError):
        raise InputError([_fault(bundle, "", "is not JSON, or has a key twice")]) from None
    version = data.get("bundle") if isinstance(data, dict) else None
    if version != BUNDLE_VERSION and type(version) is int:
        newer = "a newer program made it" if version > BUNDLE_VERSION else "there is no such version"
        what = f"is of version {version}, this program reads {BUNDLE_VERSION}: {newer}"
        raise InputError([_fault(bundle, "", what)])
    try:
        manifest = Manifest.model_validate(data)
    except ValidationError as error:
        found = error.errors(include_url=False, include_input=False, include_context=False)
        raise InputError(
            [
                _fault(bundle, ".".join(map(str, one["loc"])), one["msg"].lower())
                for one in found[:_KEPT_FROM_A_FAULT]
            ]
        ) from None
    named = [manifest.plan, manifest.lock, manifest.safe, manifest.data and manifest.data.file]
    absent = [name for name in named if name is not None and name not in manifest.members]
    if absent:
        raise InputError([_fault(bundle, "", f"names {name!r} and does not list it") for name in absent])
    deep = [name for name in named[:3] if name is not None and "/" in name]
    if deep:
        raise InputError([_fault(bundle, "", f"has {name!r} in a folder of its own") for name in deep])
    return manifest


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    """A JSON object whose keys stand once each."""
    found = dict(pairs)
    if len(found) < len(pairs):
        raise ValueError("a key stands twice")
    return found


def _fault(bundle: str, place: str, what: str) -> Fault:
    where = f"{MANIFEST}: {place}" if place else MANIFEST
    return Fault(file=bundle, line=None, place=where, what=what, code="bundle.manifest")

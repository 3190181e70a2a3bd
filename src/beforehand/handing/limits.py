"""What a bundle may be: stated limits, and the names that its members may have.

A bundle comes from outside. Whatever is read of one is bounded by these limits, and so is what is
packed, so that everything that can be handed over can be received.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Iterator

from beforehand.faults import Fault

MOST_MEMBERS = 64
LARGEST_MEMBER = 1 << 30
LARGEST_TOTAL = 2 << 30

# Text packs to a tenth or a fiftieth of its size; what unpacks to more is made to fill a disk.
HIGHEST_RATIO = 100

LARGEST_MANIFEST = 1 << 20
LONGEST_NAME = 200

# Names that some systems give to devices, whatever stands behind the first dot.
_DEVICES = re.compile(r"(?:con|prn|aux|nul|com[0-9¹²³]|lpt[0-9¹²³])(?:\.|$)", re.IGNORECASE)
_FORBIDDEN = re.compile(r'[<>:"|?*]')


def name_faults(names: Iterable[str], bundle: str) -> Iterator[Fault]:
    """What is wrong with the names of members, each name on every system that a recipient may have.

    Parameters
    ----------
    names : iterable of str
        As they stand in the bundle.
    bundle : str
        How faults name the bundle.
    """
    seen: dict[str, str] = {}
    listed = list(names)
    for name in listed:
        what = _wrong_with(name)
        if what is not None:
            yield Fault(file=bundle, line=None, place=name, what=what, code="bundle.name")
        folded = unicodedata.normalize("NFC", name).casefold()
        if folded in seen:
            what = "stands twice" if seen[folded] == name else f"is {seen[folded]!r} in other letters"
            yield Fault(file=bundle, line=None, place=name, what=what, code="bundle.twice")
        seen.setdefault(folded, name)
    for folded, name in seen.items():
        if any(other.startswith(f"{folded}/") for other in seen):
            what = "is a file and a folder at once"
            yield Fault(file=bundle, line=None, place=name, what=what, code="bundle.twice")


def _wrong_with(name: str) -> str | None:
    """Why a member may not have this name; None for a good one."""
    parts = name.split("/")
    if not name.strip():
        return "has no name"
    if len(name) > LONGEST_NAME:
        return f"has a name of {len(name):,} characters; at most {LONGEST_NAME} are let in"
    if not name.isprintable():
        return "has a name with signs that do not print"
    if "\\" in name:
        return "has a backslash in its name"
    if name.startswith("/") or re.match(r"[A-Za-z]:", name):
        return "has an absolute path for a name"
    if ".." in parts:
        return "leads out of the folder"
    if any(part in ("", ".") for part in parts):
        return "is a folder, or has an empty part in its path"
    if _FORBIDDEN.search(name) or any(_DEVICES.match(part) or part[-1] in " ." for part in parts):
        return "has a name that not every system can hold"
    return None

"""What can be wrong with an input, as data.

The tree of errors that people may see::

    BeforehandError            root; carries a stable ``code`` and an exit code
    ├── InputError             one or more ``Fault``s of what was handed in
    │   ├── PlanError          the plan is not one that can be run
    │   ├── DataError          the table does not keep the plan's contract
    │   └── LockError          the lockfile is not one that can be read
    ├── NumericalError         the numbers do not determine an answer
    └── WriteError             a file could not be written; the old one is whole

Anything else that is raised is a bug, and keeps its traceback.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

EXIT_DONE = 0
EXIT_UNUSABLE = 2
EXIT_DIFFERS = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """One thing that is wrong, with its place.

    Attributes
    ----------
    file : str
        The file as the caller named it; never made absolute.
    line : int or None
        Line in that file, from 1; None where a line has no meaning.
    place : str
        Path of the field (``predictors[2].range``) or column and row of the table.
    what : str
        What is wrong and, where one is near, what would be right.
    code : str
        Stable name of this kind of fault, for programs.
    """

    file: str
    line: int | None
    place: str
    what: str
    code: str

    def __str__(self) -> str:
        where = self.file if self.line is None else f"{self.file}:{self.line}"
        return f"{where}: {self.place}: {self.what}" if self.place else f"{where}: {self.what}"


class BeforehandError(Exception):
    """Root of every error that a person may be shown in one line."""

    code = "error"
    exit_code = EXIT_UNUSABLE


class InputError(BeforehandError):
    """Something handed in cannot be used; ``faults`` holds every reason."""

    code = "input"

    def __init__(self, faults: Sequence[Fault]) -> None:
        if not faults:
            raise ValueError("an input error needs at least one fault")
        self.faults = tuple(faults)
        super().__init__("\n".join(str(fault) for fault in self.faults))


class PlanError(InputError):
    """The plan is not one that can be run."""

    code = "plan"


class DataError(InputError):
    """The table does not keep the plan's contract."""

    code = "data"


class LockError(InputError):
    """The lockfile cannot be read: damaged, tampered with, or of a newer language."""

    code = "lock"


class NumericalError(BeforehandError):
    """The numbers do not determine an answer, for example too few rows for the model."""

    code = "numerical"


class WriteError(BeforehandError):
    """A file could not be written; what stood there before is untouched."""

    code = "write"


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known name closest to ``word``, or None when none is near."""
    names = list(known)
    folded = {name.casefold(): name for name in reversed(names)}
    found = difflib.get_close_matches(word.casefold(), list(folded), n=1, cutoff=0.6)
    return folded[found[0]] if found else None


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """The tail of a message: `` (nearest: 'humidity')``, or nothing when none is near."""
    name = nearest(word, known)
    return "" if name is None else f" (nearest: {name!r})"

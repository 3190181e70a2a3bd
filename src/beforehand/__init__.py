"""Write every decision of a multiple regression as a rule before seeing results; run and record it.

The functions are loaded when first asked for, so that importing the package costs nothing.

Examples
--------
>>> import beforehand
>>> sorted(name for name in dir(beforehand) if name in ("read_plan", "run", "replay"))
['read_plan', 'replay', 'run']
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

from beforehand.version import __version__

if TYPE_CHECKING:
    from beforehand.api import (
        Engine,
        Predictions,
        Rehearsal,
        Replay,
        Run,
        Story,
        check,
        compare,
        draft,
        handover,
        lock_text,
        plan_from_mapping,
        predict,
        read_lock,
        read_plan,
        read_rehearsal,
        receive,
        refresh,
        rehearse,
        replay,
        run,
        seal,
        trace,
        write_lock,
        write_rehearsal,
    )
    from beforehand.faults import (
        BeforehandError,
        DataError,
        Fault,
        InputError,
        LockError,
        NumericalError,
        PlanError,
        WriteError,
    )
    from beforehand.lock import Answer, Lock
    from beforehand.plan import Plan
    from beforehand.reporting.writing import report

_HOMES = {
    "beforehand.api": (
        "Engine",
        "Predictions",
        "Rehearsal",
        "Replay",
        "Run",
        "Story",
        "check",
        "compare",
        "draft",
        "handover",
        "lock_text",
        "plan_from_mapping",
        "predict",
        "read_lock",
        "read_plan",
        "read_rehearsal",
        "receive",
        "refresh",
        "rehearse",
        "replay",
        "run",
        "seal",
        "trace",
        "write_lock",
        "write_rehearsal",
    ),
    "beforehand.faults": (
        "BeforehandError",
        "DataError",
        "Fault",
        "InputError",
        "LockError",
        "NumericalError",
        "PlanError",
        "WriteError",
    ),
    "beforehand.lock": ("Answer", "Lock"),
    "beforehand.plan": ("Plan",),
    "beforehand.reporting.writing": ("report",),
}
_HOME_OF = {name: home for home, names in _HOMES.items() for name in names}

__all__ = [
    "Answer",
    "BeforehandError",
    "DataError",
    "Engine",
    "Fault",
    "InputError",
    "Lock",
    "LockError",
    "NumericalError",
    "Plan",
    "PlanError",
    "Predictions",
    "Rehearsal",
    "Replay",
    "Run",
    "Story",
    "WriteError",
    "__version__",
    "check",
    "compare",
    "draft",
    "handover",
    "lock_text",
    "plan_from_mapping",
    "predict",
    "read_lock",
    "read_plan",
    "read_rehearsal",
    "receive",
    "refresh",
    "rehearse",
    "replay",
    "report",
    "run",
    "seal",
    "trace",
    "write_lock",
    "write_rehearsal",
]


def __getattr__(name: str) -> Any:
    """Load a public name from its home when it is first asked for."""
    home = _HOME_OF.get(name)
    if home is None:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(importlib.import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """Every public name."""
    return sorted(__all__)

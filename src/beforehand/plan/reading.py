"""From a file, a text or a mapping to a plan, or to every fault at once.

A fault of shape does not hide a fault of fit: what is misshapen is set aside, and the rest is read
and checked as far as it goes.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from beforehand.faults import Fault, PlanError
from beforehand.plan.alternatives import read_alternatives
from beforehand.plan.block import frozen
from beforehand.plan.complaint import Complaint
from beforehand.plan.file_data import as_file_data
from beforehand.plan.model import Plan, PlanOrigin
from beforehand.plan.places import line_of
from beforehand.plan.validation import newer_language, validated, without_reserved
from beforehand.plan.yaml_nodes import MOST_BYTES, NotYamlError, decoded, document_of

# More faults than a person mends in one go.
MOST_FAULTS = 200

# How a plan made in memory is named in faults.
IN_MEMORY = "plan"


def read_plan(path: str | os.PathLike[str]) -> Plan:
    """Read a plan file.

    Parameters
    ----------
    path : str or path
        Named in faults as given.

    Returns
    -------
    Plan
        With its ``origin``.

    Raises
    ------
    PlanError
        With every fault of the file: not readable, not plain YAML, misshapen, or not fitting together.
    """
    file, name = Path(path), os.fspath(path)
    try:
        with file.open("rb") as opened:
            raw = opened.read(MOST_BYTES + 1)
        text = decoded(raw)
    except (OSError, ValueError) as problem:
        raise PlanError([_unreadable(problem, name)]) from None
    return _plan_of_text(text, PlanOrigin(path=file, name=name, lines={}))


def plan_from_text(text: str, name: str = IN_MEMORY) -> Plan:
    """Read a plan from YAML text; ``name`` stands for the file in faults. Raises PlanError."""
    if len(text) > MOST_BYTES:
        raise PlanError(
            [Fault(file=name, line=None, place="", what=f"is larger than {MOST_BYTES:,} bytes", code="size")]
        )
    return _plan_of_text(text, PlanOrigin(path=None, name=name, lines={}))


def plan_from_mapping(mapping: Mapping[str, Any], name: str = IN_MEMORY) -> Plan:
    """Make a plan from plain data under the keys of the file. Raises PlanError.

    Texts may hold what texts hold in quotes in a file: a share such as ``"40%"``, a limit such as
    ``"4/n"``; a number is a number.
    """
    found: list[Complaint] = []
    data = as_file_data(mapping, found)
    plan, more = _plan_of_data(data)
    if found or more or plan is None:
        raise PlanError(_in_order(_faults([*found, *more], name, {})))
    return plan


def _unreadable(problem: OSError | ValueError, name: str) -> Fault:
    """Why a file cannot be read."""
    if isinstance(problem, NotYamlError):
        return problem.fault.named(name)
    if isinstance(problem, FileNotFoundError):
        what = "there is no such file"
    elif isinstance(problem, IsADirectoryError):
        what = "is a folder; a plan is a file"
    elif isinstance(problem, PermissionError):
        what = "may not be read by this user"
    else:
        what = f"cannot be read: {getattr(problem, 'strerror', None) or problem}"
    return Fault(file=name, line=None, place="", what=what, code="unreadable")


def _plan_of_text(text: str, origin: PlanOrigin) -> Plan:
    """The plan of a text, with its lines."""
    try:
        document = document_of(text)
    except NotYamlError as broken:
        raise PlanError([broken.fault.named(origin.name)]) from None
    plan, found = _plan_of_data(document.data)
    faults = [fault.named(origin.name) for fault in document.faults]
    faults += _faults(found, origin.name, document.lines)
    if faults or plan is None:
        raise PlanError(_in_order(faults))
    return plan.with_origin(PlanOrigin(path=origin.path, name=origin.name, lines=document.lines))


def _faults(found: list[Complaint], name: str, lines: Mapping[str, int]) -> list[Fault]:
    """Complaints with file and line; the same one once."""
    return [
        Fault(file=name, line=line_of(one.place, lines), place=one.place, what=one.what, code=one.code)
        for one in dict.fromkeys(found)
    ]


def _in_order(faults: list[Fault]) -> list[Fault]:
    """Faults by line, as many as a person reads."""
    ordered = sorted(faults, key=lambda fault: fault.line or 0)
    if len(ordered) <= MOST_FAULTS:
        return ordered
    rest = len(ordered) - MOST_FAULTS
    more = Fault(
        file=ordered[0].file, line=None, place="", what=f"has {rest} more faults, not listed", code="more"
    )
    return [*ordered[:MOST_FAULTS], more]


def _plan_of_data(data: dict[str, Any]) -> tuple[Plan | None, list[Complaint]]:
    """The plan that data makes, or what is wrong with it."""
    newer = newer_language(data)
    if newer is not None:
        return None, [newer]
    found: list[Complaint] = []
    data = without_reserved(data, found)
    alternatives = data.get("alternatives")
    plan, misfits, complete = validated({key: value for key, value in data.items() if key != "alternatives"})
    found += misfits
    if plan is None or alternatives is None:
        if alternatives is None and "alternatives" in data:
            found.append(
                Complaint("alternatives", "is nothing; leave it out or give it named changes", "mapping")
            )
        return plan, found
    changes, misfits = read_alternatives(plan, alternatives, complete=complete)
    found += misfits
    return (None if found else plan.model_copy(update={"alternatives": frozen(changes)})), found

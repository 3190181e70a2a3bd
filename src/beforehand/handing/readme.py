"""The few lines in a bundle for the person who gets it."""

from __future__ import annotations

import textwrap

from beforehand.handing.manifest import Rows
from beforehand.lock import Lock

READ_ME = "READ-ME.txt"

_WIDTH = 88


def read_me(title: str, plan: str, lock: Lock | None, rows: Rows | None, *, share_safe: bool) -> str:
    """What the bundle is, and how to receive, check and replay it.

    Parameters
    ----------
    title, plan : str
        The plan's title and the name of its file.
    lock : Lock or None
    rows : Rows or None
        The table in the bundle.
    share_safe : bool
        Whether the lock is a copy that gives no row away.
    """
    parts = [
        title,
        f"The plan of a multiple regression ({plan}): every modelling decision as a rule, written down "
        "before the results. The program beforehand checks it, runs it and records every fit and ruling.",
    ]
    if lock is not None and share_safe:
        parts.append(
            f"{_stem(plan)}.safe.yaml is a copy of the record without what could give a row away. It "
            "cannot be replayed; it says what is left out."
        )
    elif lock is not None:
        parts.append(f"{_stem(plan)}.lock.yaml is the record of its run.")
    if rows is not None:
        told = {
            "hashed": "Row labels are keyed hashes, and rows stand in the order of the labels.",
            "shown": "Row labels are shown.",
            "none": "Rows have no labels.",
        }[rows.labels]
        parts.append(f"{rows.file} is the table, with the columns that the plan names. {told}")
    else:
        parts.append("No table goes along. dictionary.yaml says which columns are needed.")
    parts.append("To receive it: every file is checked against manifest.json, nothing is overwritten.")
    parts.append("    beforehand receive BUNDLE.zip -d FOLDER")
    if lock is not None and not share_safe and rows is None:
        parts.append("With the table at hand, the record is computed again and compared:")
        parts.append("    beforehand receive BUNDLE.zip -d FOLDER --data TABLE.csv")
    parts.append("To look into it afterwards, in FOLDER:")
    looks = [f"    beforehand check {plan}"] if rows is not None else []
    if lock is not None and not share_safe:
        looks.append(f"    beforehand trace {_stem(plan)}.lock.yaml SUBJECT")
    parts.append("\n".join([*looks, "    beforehand guide handover"]))
    parts.append(
        "The checksums show damage, not who sent the bundle: compare the SHA-256 of the whole file with "
        "the sender by another way."
    )
    return (
        "\n\n".join(part if part.startswith("    ") else textwrap.fill(part, _WIDTH) for part in parts) + "\n"
    )


def _stem(plan: str) -> str:
    """The plan's name without its ending."""
    for end in (".plan.yaml", ".plan.yml", ".yaml", ".yml"):
        if plan.endswith(end) and plan != end:
            return plan.removesuffix(end)
    return plan

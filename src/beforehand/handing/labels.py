"""Locks whose rows have other labels: the same rows, under the names of another lock."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from beforehand.lock import Lock


def as_labelled(old: Lock, new: Lock, *, fingerprint: bool) -> Lock:
    """A new lock with the labels of an old one, for a comparison of all that does not rest on labels.

    Without the key a hash cannot be made again. Rows stand in both locks in the same order, so that
    the first row that the old one names is the first that the new one names.

    Parameters
    ----------
    old, new : Lock
    fingerprint : bool
        Whether the fingerprint is taken from the old lock too, since the table's labels are hashes.

    Returns
    -------
    Lock
        The new one, with labels and with digests of labels from the old one.
    """
    written = new.model_dump(by_alias=True)
    before = old.model_dump(by_alias=True)
    for mine, theirs in [(written, before), *_alternatives(written, before)]:
        names = dict(zip(_named_rows(mine), _named_rows(theirs), strict=False))
        _relabel(mine, names)
        for fit, other in zip(mine["fits"], theirs["fits"], strict=False):
            if fit["rows"]["n"] == other["rows"]["n"]:
                fit["rows"]["digest"] = other["rows"]["digest"]
    if fingerprint:
        written["data"]["fingerprint"] = before["data"]["fingerprint"]
    return Lock.model_validate(written)


def _alternatives(new: dict[str, Any], old: dict[str, Any]) -> Iterator[tuple[Any, Any]]:
    """Alternatives of both locks, side by side."""
    for name, record in new["alternatives"].items():
        if name in old["alternatives"]:
            yield record, old["alternatives"][name]


def is_about_a_row(ground: str) -> bool:
    """Whether the subject of a ruling on this ground is a row."""
    return ground.startswith("row_") or ground == "cap_reached"


def _named_rows(record: dict[str, Any]) -> list[str]:
    """Labels in a record, each once, in the order in which they first stand in it."""
    labels = [ruling["subject"] for ruling in record["rulings"] if is_about_a_row(ruling["ground"])]
    labels += [row["row"] for row in (*record["rows_removed"], *record["checks"]["influence"])]
    return list(dict.fromkeys(labels))


def _relabel(record: dict[str, Any], names: dict[str, str]) -> None:
    """Put other labels in the place of those of a record."""
    for row in (*record["rows_removed"], *record["checks"]["influence"]):
        row["row"] = names.get(row["row"], row["row"])
    for ruling in record["rulings"]:
        if is_about_a_row(ruling["ground"]):
            label = ruling["subject"]
            ruling["subject"] = names.get(label, label)
            ruling["says"] = ruling["says"].replace(f"ow {label} ", f"ow {names.get(label, label)} ")
    start = "without row "
    for fit in record["fits"]:
        if fit["why"].startswith(start):
            label = fit["why"].removeprefix(start)
            fit["why"] = start + names.get(label, label)
    told = {f"ow {label} ": f"ow {name} " for label, name in names.items()}
    answer = record["answer"]
    if answer is not None and answer["fragility"] is not None:
        for label, name in told.items():
            answer["fragility"]["says"] = answer["fragility"]["says"].replace(label, name)

"""A comparison as Markdown for a comment on a proposed change, and as plain data for programs."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

from beforehand.comparing.answers import CoefficientPair, Figure
from beforehand.comparing.locks import LockComparison
from beforehand.comparing.paths import RulingPair
from beforehand.comparing.sentences import FIGURE_WORDS, facts, summary
from beforehand.comparing.whole import Comparison
from beforehand.lock import RulingRecord
from beforehand.wording import number

# Signs that Markdown could take for more than themselves.
_SIGNS = re.compile(r"([\\`*_{}\[\]#|~$])")
# A comment system writes to whoever stands behind an @; nobody is to be called by a plan.
_CALL = re.compile(r"@(?=\w)")

FIGURE_DIGITS = 4


def markdown(compared: Comparison) -> str:
    """The comparison in Markdown: a heading, the changes as a table, the two records side by side.

    Parameters
    ----------
    compared : Comparison

    Returns
    -------
    str
        Ends with one line break. No text of a plan or a lock has a meaning in it beyond itself.
    """
    lines = [f"### {cell(compared.old)} → {cell(compared.new)}", "", cell(summary(compared))]
    if compared.changes:
        rows = [(cell(one.clause), cell(one.grade), cell(one.says)) for one in compared.changes]
        lines += ["", *_table(("Clause", "Class", "What changes"), rows)]
    if compared.locks is not None and not compared.locks.same:
        lines += _of_locks(compared.locks)
    return "\n".join(lines) + "\n"


def mapping(compared: Comparison) -> dict[str, Any]:
    """The comparison as plain data, with keys that are a promise to programs."""
    return {
        "same": compared.same,
        "old": compared.old,
        "new": compared.new,
        "counts": dict(compared.counts),
        "changes": [{"clause": one.clause, "class": one.grade, "says": one.says} for one in compared.changes],
        "locks": None if compared.locks is None else _locks_mapping(compared.locks),
    }


def cell(text: str) -> str:
    """Text as it stands in one cell of a table, on one line and without any effect."""
    plain = "".join(
        sign if sign.isprintable() else " " if sign.isspace() else f"U+{ord(sign):04X}" for sign in text
    )
    quoted = plain.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    return _CALL.sub("@<!-- -->", _SIGNS.sub(r"\\\1", quoted))


def _table(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    """A table of cells that are escaped already."""
    return [
        f"| {' | '.join(heads)} |",
        f"|{'|'.join('---' for _ in heads)}|",
        *(f"| {' | '.join(row)} |" for row in rows),
    ]


def _of_locks(locks: LockComparison) -> list[str]:
    """The two records."""
    lines = ["", "#### The two records", ""]
    lines += [f"- **{cell(fact.label)}**: {cell(fact.says)}" for fact in facts(locks)]
    if locks.coefficients:
        heads = ("Term", "Before", "Now", "Shift in old standard errors")
        lines += ["", *_table(heads, [_coefficient(pair) for pair in locks.coefficients])]
    if locks.figures:
        lines += ["", *_table(("Fit", "Before", "Now"), [_figure(one) for one in locks.figures])]
    return lines


def _coefficient(pair: CoefficientPair) -> tuple[str, ...]:
    """One row of the table of coefficients."""
    shift = pair.why or "none" if pair.shift is None else f"{pair.shift:+.2f}"
    return cell(pair.term), _number(pair.old), _number(pair.new), cell(shift)


def _figure(figure: Figure) -> tuple[str, ...]:
    """One row of the table of the fit."""
    return FIGURE_WORDS[figure.name], _number(figure.old), _number(figure.new)


def _number(value: float | None) -> str:
    return "" if value is None else cell(number(value, FIGURE_DIGITS))


def _locks_mapping(locks: LockComparison) -> dict[str, Any]:
    """Two records as plain data."""
    return {
        "same": locks.same,
        "status": {"old": locks.old_status, "new": locks.new_status},
        "data": {
            "same": locks.data.same,
            "comparable_labels": locks.data.comparable,
            "fingerprint": {"old": locks.data.old_fingerprint, "new": locks.data.new_fingerprint},
            "rows": {"old": locks.data.old_rows, "new": locks.data.new_rows},
        },
        "ledger": [{"stage": one.stage, "old": one.old, "new": one.new} for one in locks.ledger],
        "rows_came": list(locks.rows_came),
        "rows_went": list(locks.rows_went),
        "predictors": [
            {
                "predictor": one.predictor,
                "old": {"verdict": one.old, "transform": one.old_transform},
                "new": {"verdict": one.new, "transform": one.new_transform},
            }
            for one in locks.predictors
        ],
        "parting": None if locks.parting is None else _pair(locks.parting),
        "flipped": [_pair(pair) for pair in locks.flipped],
        "only_old": [_ruling(ruling) for ruling in locks.only_old],
        "only_new": [_ruling(ruling) for ruling in locks.only_new],
        "coefficients": [
            {
                "term": one.term,
                "old": one.old,
                "new": one.new,
                "old_standard_error": one.old_error,
                "new_standard_error": one.new_error,
                "shift": one.shift,
                "why_no_shift": one.why,
            }
            for one in locks.coefficients
        ],
        "figures": {one.name: {"old": one.old, "new": one.new} for one in locks.figures},
        "alternatives": [
            {"alternative": one.alternative, "old": one.old, "new": one.new} for one in locks.alternatives
        ],
        "sections": list(locks.sections),
    }


def _pair(pair: RulingPair) -> dict[str, Any]:
    return {"old": _ruling(pair.old), "new": _ruling(pair.new)}


def _ruling(ruling: RulingRecord | None) -> dict[str, Any] | None:
    """What identifies a ruling, and what it says."""
    if ruling is None:
        return None
    parts = ("id", "step", "clause", "subject", "verdict", "says")
    return {part: getattr(ruling, part) for part in parts}

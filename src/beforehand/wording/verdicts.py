"""The verdict of a ruling in one word, from the ground on which it was made."""

from __future__ import annotations

# The verdict of a ruling in one word, by the ground on which it was made.
_VERDICTS: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("stop", ("stops_", "kept_without_fill")),
    ("remove", ("rows_without_outcome", "too_empty", "incomplete_rows_leave", "leaves_", "row_leaves_")),
    ("remove", ("weaker_leaves", "both_leave", "significant_alone_stays", "large_change_weaker_leaves")),
    ("remove", ("small_change_weaker_leaves", "not_in_best_subset", "weak_without_theory")),
    ("keep", ("full_enough", "two_valued", "unchecked", "straight", "stays", "outcome_stays")),
    ("keep", ("outcome_unmended", "kept_", "left_to_selection", "both_stay", "small_change_both_stay")),
    ("keep", ("large_change_both_stay", "none_flagged", "exact_fit", "flagged_rows_stay", "cap_reached")),
    ("keep", ("full_model_stands", "no_subset", "nothing_to_learn_from")),
    ("fill", ("filled",)),
    ("transform", ("rung_adopted",)),
    ("reject", ("rung_fails",)),
    ("not_applicable", ("rung_not_applicable",)),
    ("examine", ("bent", "outcome_fails", "joint_signal")),
    ("significant", ("model_significant",)),
    ("weak", ("model_weak",)),
    ("near_miss", ("near_miss",)),
    ("mean_only", ("mean_is_answer",)),
    ("robust_errors", ("robust_errors_used",)),
    ("report", ("robust_not_possible",)),
)
_ENDINGS = (
    ("_passes", "pass"),
    ("_not_checked", "not_applicable"),
    ("_fails_stop", "stop"),
    ("_fails_report", "report"),
    ("_fails_robust_errors", "robust_errors"),
)


def verdict_of(ground: str) -> str:
    """The verdict in one word: ``keep``, ``remove``, ``transform``, ``stop`` and their like.

    Examples
    --------
    >>> verdict_of("too_empty"), verdict_of("kept_always"), verdict_of("spread_fails_report")
    ('remove', 'keep', 'report')
    """
    for ending, verdict in _ENDINGS:
        if ground.endswith(ending):
            return verdict
    return next(
        verdict
        for verdict, beginnings in _VERDICTS
        if any(ground == begin or (begin.endswith("_") and ground.startswith(begin)) for begin in beginnings)
        or (verdict == "keep" and ground.startswith("stays"))
    )

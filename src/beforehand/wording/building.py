"""Sentences about missing data, transforms, dependence, keep rules and collinearity."""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.wording.clauses import (
    Sentence,
    checks,
    dependence_words,
    filling,
    pair_says,
    rung_words,
    say,
)
from beforehand.wording.phrases import limit_text, number, p_value, plural, share

MISSING_DATA: Mapping[str, Sentence] = {
    "rows_without_outcome": lambda r: (
        f"{plural(r.evidence['rows'], 'row')} of {number(r.evidence['of'])} "
        f"{'has' if r.evidence['rows'] == 1 else 'have'} no {r.subject} and "
        f"{'leaves' if r.evidence['rows'] == 1 else 'leave'}."
    ),
    "full_enough": lambda r: (
        f"{r.subject} stays: {share(r.evidence['share'])} missing is not above {share(r.limit)}."
    ),
    "too_empty": lambda r: (
        f"{r.subject} leaves: {share(r.evidence['share'])} missing is above {share(r.limit)}."
    ),
    "kept_without_fill": lambda r: (
        f"The run stops: {r.subject} is kept by rule, {share(r.evidence['share'])} of it is missing, "
        "and the plan has no fill for it."
    ),
    "nothing_to_learn_from": say("{s} has no observed value to learn a fill from."),
    "filled": lambda r: (
        f"{plural(r.evidence['cells'], 'missing cell')} of {r.subject} "
        f"{'is' if r.evidence['cells'] == 1 else 'are'} filled"
        + (
            f" with {filling(r.evidence['value'])} ({str(r.evidence['method']).replace('_', ' ')})."
            if r.evidence["value"] is not None
            else " by regression on the other complete predictors."
        )
    ),
    "incomplete_rows_leave": lambda r: (
        f"{plural(r.evidence['rows'], 'row')} of {number(r.evidence['of'])} still incomplete "
        f"{'leaves' if r.evidence['rows'] == 1 else 'leave'}."
    ),
}

TRANSFORMS: Mapping[str, Sentence] = {
    "two_valued": say("{s} has two values only: a curve has no meaning for it."),
    "unchecked": say("{s} stays as it is: the plan declares no check for it."),
    "straight": lambda r: f"{r.subject} stays as it is: {checks(r)}.",
    "bent": lambda r: f"{r.subject} goes to the ladder: {checks(r)}.",
    "rung_not_applicable": lambda r: f"{r.subject} cannot enter {rung_words(r)}: {r.because}.",
    "rung_fails": lambda r: f"{r.subject} {rung_words(r)} does not pass: {checks(r)}.",
    "rung_adopted": lambda r: f"{r.subject} enters {rung_words(r)}: {checks(r)}.",
    "stays_unmended": say("{s} stays as it is although no rung passes; its check still fails."),
    "leaves_unmended": say("{s} leaves: no rung of the ladder passes."),
    "outcome_stays": lambda r: f"{r.subject} stays on its own scale: {checks(r)}.",
    "outcome_fails": lambda r: f"{r.subject} goes to its ladder: {checks(r)}.",
    "outcome_unmended": say("{s} stays on its own scale although no rung passes."),
}

DEPENDENCE: Mapping[str, Sentence] = {
    "leaves_constant": lambda r: (
        f"{r.subject} leaves: it is constant in the rows in use ({dependence_words(r)})."
    ),
    "leaves_dependent": lambda r: (
        f"{r.subject} leaves: it is determined by others exactly ({dependence_words(r)})."
    ),
    "stops_constant": lambda r: (
        f"The run stops: {r.subject} is constant in the rows in use and a rule keeps it "
        f"({dependence_words(r)})."
    ),
    "stops_dependent": lambda r: (
        f"The run stops: {dependence_words(r)} holds exactly and rules keep every predictor in it."
    ),
}

KEEP: Mapping[str, Sentence] = {
    "kept_always": lambda r: f"{r.subject} stays by rule: {r.because}",
    "kept_below_bound": lambda r: (
        f"{r.subject} stays by rule, p {p_value(r.evidence.get('p'))} is not above "
        f"{limit_text(r.limit)}: {r.because}"
        if r.evidence.get("p") is not None
        else f"{r.subject} stays by rule: {r.because}"
    ),
    "kept_last_of_group": lambda r: f"{r.subject} stays by rule as the last of its group: {r.because}",
    "kept_for_product": lambda r: f"{r.subject} stays: the product {r.because} is in the model.",
}

COLLINEARITY: Mapping[str, Sentence] = {
    "joint_signal": lambda r: (
        f"The model is significant (p {p_value(r.evidence['p_model'])}) and no predictor is: "
        f"{r.subject} are examined (correlation {number(r.evidence['r'])})."
    ),
    "left_to_selection": pair_says("{s} is left to selection: {pair}; only {partner} is significant."),
    "weaker_leaves": pair_says(
        "{s} leaves: {pair}; beside it p is {p} for {s} and {partner_p} for {partner}."
    ),
    "both_leave": pair_says(
        "{s} leaves: {pair}; neither is significant, together or alone "
        "(alone p {alone}, {partner} {partner_alone})."
    ),
    "significant_alone_stays": pair_says(
        "{s} leaves: {pair}; neither is significant beside the other; alone p is {alone} "
        "for {s} and {partner_alone} for {partner}."
    ),
    "both_stay": pair_says("{s} and {partner} stay: both are significant and the plan keeps both."),
    "small_change_both_stay": pair_says(
        "{s} and {partner} stay: both are significant, and without {s} {change}: a small change."
    ),
    "large_change_both_stay": pair_says(
        "{s} and {partner} stay: both are significant, and without {s} {change}: a large change."
    ),
    "large_change_weaker_leaves": pair_says(
        "{s} leaves: {pair}; both are significant, {s} is the weaker, and without it "
        "{change}: a large change."
    ),
    "small_change_weaker_leaves": pair_says(
        "{s} leaves: {pair}; both are significant, {s} is the weaker, and without it "
        "{change}: a small change."
    ),
}

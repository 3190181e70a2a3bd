"""Sentences about influence, selection and the final checks."""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.steps.rulings import Ruling
from beforehand.wording.clauses import (
    Sentence,
    against,
    p_says,
    say,
)
from beforehand.wording.phrases import limit_text, number, p_value, plural, share


def _final(what: str, good: str, bad: str) -> Mapping[str, Sentence]:
    """The sentences of one final check, for every outcome and action."""

    def numbers(ruling: Ruling) -> str:
        p, statistic = ruling.evidence.get("p"), ruling.evidence.get("statistic")
        if p is None:
            low, high = ruling.evidence.get("low"), ruling.evidence.get("high")
            return f"{number(statistic)}, declared range {number(low)} to {number(high)}"
        return f"p {p_value(p)}, limit {limit_text(ruling.limit)}"

    def about(ruling: Ruling) -> str:
        return "" if ruling.subject == "the model" else f" of {ruling.subject}"

    return {
        f"{what}_passes": lambda r: f"{good.format(about=about(r))} ({numbers(r)}).",
        f"{what}_not_checked": lambda r: (
            f"{what.replace('_', ' ').capitalize()}{about(r)} is not checked: {r.because}."
        ),
        f"{what}_fails_report": lambda r: (
            f"{bad.format(about=about(r))} ({numbers(r)}); the plan says to report it."
        ),
        f"{what}_fails_stop": lambda r: (
            f"{bad.format(about=about(r))} ({numbers(r)}); the plan says to stop."
        ),
        f"{what}_fails_robust_errors": lambda r: (
            f"{bad.format(about=about(r))} ({numbers(r)}); the plan calls for robust standard errors."
        ),
    }


INFLUENCE: Mapping[str, Sentence] = {
    "none_flagged": say("No row passes a limit of influence."),
    "exact_fit": say("Influence is not examined: the model fits without residuals."),
    "flagged_rows_stay": lambda r: (
        f"{plural(r.evidence['rows'], 'flagged row')} "
        f"{'stays' if r.evidence['rows'] == 1 else 'stay'}: none alone changes the answer as much "
        "as the plan declares (largest change of a coefficient "
        f"{number(r.evidence['largest_change_coefficient'])} standard errors)."
    ),
    "cap_reached": lambda r: (
        f"The cap is reached: {plural(r.evidence['removed'], 'row')} of at most {number(r.evidence['most'])} "
        f"({share(r.limit)}) removed; row {r.subject} would be next and stays."
    ),
    "row_leaves_sole": lambda r: (
        f"Row {r.subject} leaves: {r.evidence.get('of')} cannot be estimated without it, "
        "so one row alone makes its coefficient."
    ),
    "row_leaves_coefficient": lambda r: (
        f"Row {r.subject} leaves: without it a coefficient (of {r.evidence.get('of')}) moves by "
        f"{number(r.evidence['change_coefficient'])} standard errors, limit {limit_text(r.limit)}."
    ),
    "row_leaves_r_squared": lambda r: (
        f"Row {r.subject} leaves: without it R² changes by {number(r.evidence['change_r_squared'])}, "
        f"limit {limit_text(r.limit)}."
    ),
    "row_leaves_significance_changes": lambda r: (
        f"Row {r.subject} leaves: "
        f"without it the significance of {r.evidence['significance_changes']} changes."
    ),
    "row_leaves_sign_changes": lambda r: (
        f"Row {r.subject} leaves: without it the sign of {r.evidence['sign_changes']} changes."
    ),
}

SELECTION: Mapping[str, Sentence] = {
    "model_significant": lambda r: f"The model as a whole is significant: {against(r)}.",
    "model_weak": lambda r: f"The model as a whole is not significant: {against(r)}.",
    "weak_without_theory": say("No theory backs a predictor, so the mean is the answer."),
    "near_miss": lambda r: (
        f"{r.subject} is a near miss: p {p_value(r.evidence['p'])}; "
        + (
            f"an effect of the observed size would need {number(r.evidence['rows_needed'])} rows "
            f"for power {number(r.evidence['power'], 2)}."
            if r.evidence.get("rows_needed") is not None
            else "no sample of a practical size would show an effect so small."
        )
    ),
    "full_model_stands": say("The full model stands: the plan selects nothing."),
    "leaves_backward": p_says("{s} leaves: {p}."),
    "leaves_aic": lambda r: (
        f"{r.subject} leaves: AIC falls by {number(-float(str(r.evidence['change_aic'])))}."
    ),
    "leaves_bic": lambda r: (
        f"{r.subject} leaves: BIC falls by {number(-float(str(r.evidence['change_bic'])))}."
    ),
    "not_in_best_subset": say("{s} leaves: it is not in the best subset."),
    "no_subset": say(
        "No lawful subset has only significant or kept predictors; {s} is one of those searched."
    ),
    "stays": p_says("{s} stays: {p}."),
    "stays_above_alpha": p_says("{s} stays although {p}."),
    "mean_is_answer": say("No predictor is left: the mean of {s} is the answer."),
}

FINAL_CHECKS: Mapping[str, Sentence] = {
    **_final("curvature", "The relation{about} is straight", "The relation{about} still bends"),
    **_final(
        "reset", "Powers of the fitted values add nothing", "Powers of the fitted values add to the fit"
    ),
    **_final("spread", "The spread is even", "The spread is uneven"),
    **_final("normality", "The residuals look normal", "The residuals are not normal"),
    **_final(
        "independence", "The residuals are independent in order", "The residuals hang together in order"
    ),
    "robust_errors_used": lambda r: (
        "Robust standard errors (HC3) stand in the final table; "
        + (
            f"they change the significance of {r.evidence['changed']}."
            if r.evidence["changes"]
            else "they change no predictor's significance."
        )
    ),
    "robust_not_possible": lambda r: f"Robust standard errors cannot be given: {r.because}.",
}

"""Every sentence that the program says about a ruling, made in one place from its ground.

Report, terminal and lock say the same because they ask here. Nothing here decides anything.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

from beforehand.steps.rulings import Ruling

RUNG_WORDS: Mapping[str, str] = {
    "identity": "as it is",
    "square": "squared",
    "cube": "cubed",
    "square_root": "as its square root",
    "cube_root": "as its cube root",
    "log": "as its natural logarithm",
    "reciprocal": "as its reciprocal",
    "box_cox": "under a Box-Cox power",
}


def number(value: object, digits: int = 3) -> str:
    """A number for a sentence: few digits, no exponent where a person would not write one."""
    if value is None:
        return "not available"
    if isinstance(value, bool) or not isinstance(value, int | float):
        return str(value)
    if isinstance(value, int):
        return f"{value:,}"
    if value == 0:
        return "0"
    if 1e-4 <= abs(value) < 1e6:
        decimals = max(0, digits - 1 - _magnitude(value))
        return f"{value:.{decimals}f}"
    return f"{value:.{digits - 1}e}"


def limit_text(value: object) -> str:
    """A limit as a person wrote it in the plan: 0.05, not 0.0500."""
    return f"{value:.6g}" if isinstance(value, int | float) else "not available"


def p_value(value: object) -> str:
    """A p for a sentence: three decimals, or that it is below a thousandth."""
    if value is None or not isinstance(value, int | float):
        return "not available"
    return "below 0.001" if value < 0.001 else f"{value:.3f}"


def share(value: object) -> str:
    """A share as a percentage."""
    return f"{100 * float(value):.3g} %" if isinstance(value, int | float) else "not available"


def plural(count: object, one: str, many: str | None = None) -> str:
    """A counted noun: ``1 row``, ``2 rows``."""
    number_of = int(count) if isinstance(count, int | float) else 0
    return f"{number_of:,} {one if number_of == 1 else (many or one + 's')}"


def _magnitude(value: float) -> int:
    """The exponent of ten of a number's first digit."""
    return int(f"{value:e}".rsplit("e", 1)[1])


def _against(ruling: Ruling) -> str:
    """The p of a ruling and the limit it passes, as ``0.412 is above 0.05``."""
    p = ruling.evidence.get("p")
    if not isinstance(p, int | float) or ruling.limit is None:
        return "its p is not available"
    return f"p {_p_against(p, ruling.limit)}"


def _p_against(p: float, limit: float) -> str:
    side = "above" if p > limit else "not above"
    shown = p_value(p)
    if shown == "below 0.001":
        return (
            f"below 0.001 is not above {limit_text(limit)}"
            if p <= limit
            else f"{p:.3g} is above {limit_text(limit)}"
        )
    if float(shown) == round(limit, 3) and p != limit:
        shown = f"{p:.6g}"
    return f"{shown} is {side} {limit_text(limit)}"


def _checks(ruling: Ruling) -> str:
    """The checks of a ruling with their p, as ``the curvature check gives p 0.003``."""
    named = [(key[2:], value) for key, value in ruling.evidence.items() if key.startswith("p_")]
    parts = [
        f"{CHECK_WORDS.get(name, name)} gives p {p_value(value)}"
        if value is not None
        else f"{CHECK_WORDS.get(name, name)} cannot be made"
        for name, value in named
    ]
    limit = "" if ruling.limit is None else f" (limit {limit_text(ruling.limit)})"
    return (" and ".join(parts) + limit) if parts else "no check is declared"


CHECK_WORDS: Mapping[str, str] = {
    "curvature": "the curvature check",
    "breusch_pagan": "the check of equal spread",
    "white": "White's check of equal spread",
    "jarque_bera": "the Jarque-Bera check of normal residuals",
    "shapiro_wilk": "the Shapiro-Wilk check of normal residuals",
    "reset": "the RESET check",
    "breusch_godfrey": "the Breusch-Godfrey check",
    "durbin_watson": "the Durbin-Watson statistic",
}


def _pair(ruling: Ruling) -> str:
    """What called a pair up."""
    evidence = ruling.evidence
    partner = evidence.get("partner")
    if "correlation" in evidence:
        return f"its correlation with {partner} is {number(evidence['correlation'])}"
    if "vif" in evidence:
        return f"beside {partner} the largest variance inflation is {number(evidence['vif'])}"
    return f"it and {partner} share one signal (correlation {number(evidence.get('r'))})"


def _rung(ruling: Ruling) -> str:
    words = RUNG_WORDS.get(str(ruling.evidence.get("rung")), str(ruling.evidence.get("rung")))
    exponent = ruling.evidence.get("exponent")
    return words if exponent is None else f"{words} of {number(exponent)}"


def _change(ruling: Ruling) -> str:
    evidence = ruling.evidence
    of = evidence.get("of")
    moved = evidence.get("change_coefficient")
    tail = f" (of {of})" if of else ""
    return (
        f"R² changes by {number(abs(float(str(evidence.get('change_r_squared') or 0.0))))} and a coefficient by "
        f"{number(moved)} standard errors{tail}"
    )


Sentence = Callable[[Ruling], str]


def _say(template: str) -> Sentence:
    """A sentence with the subject only."""
    return lambda ruling: template.format(s=ruling.subject)


def _p_says(template: str) -> Sentence:
    """A sentence with the subject and its p against the limit."""
    return lambda ruling: template.format(s=ruling.subject, p=_against(ruling))


def _pair_says(template: str) -> Sentence:
    """A sentence about one of a pair."""

    def say(ruling: Ruling) -> str:
        evidence = ruling.evidence
        return template.format(
            s=ruling.subject,
            partner=evidence.get("partner"),
            pair=_pair(ruling),
            p=p_value(evidence.get("p")),
            alone=p_value(evidence.get("p_alone")),
            partner_alone=p_value(evidence.get("p_partner_alone")),
            partner_p=p_value(evidence.get("p_partner")),
            change=_change(ruling) if "change_r_squared" in evidence else "",
        )

    return say


def _dependence(ruling: Ruling) -> str:
    weights = [
        f"{number(value, 6)} × {name.removeprefix('weight of ')}"
        for name, value in ruling.evidence.items()
        if name.startswith("weight of ")
    ]
    if not weights:
        return "one level only"
    return f"{ruling.evidence.get('column')} = " + " + ".join(weights)


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


SENTENCES: Mapping[str, Sentence] = {
    # missing data
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
    "nothing_to_learn_from": _say("{s} has no observed value to learn a fill from."),
    "filled": lambda r: (
        f"{plural(r.evidence['cells'], 'missing cell')} of {r.subject} "
        f"{'is' if r.evidence['cells'] == 1 else 'are'} filled"
        + (
            f" with {limit_text(r.evidence['value']) if not isinstance(r.evidence['value'], str) else r.evidence['value']} ({str(r.evidence['method']).replace('_', ' ')})."
            if r.evidence["value"] is not None
            else " by regression on the other complete predictors."
        )
    ),
    "incomplete_rows_leave": lambda r: (
        f"{plural(r.evidence['rows'], 'row')} of {number(r.evidence['of'])} still incomplete "
        f"{'leaves' if r.evidence['rows'] == 1 else 'leave'}."
    ),
    # transforms
    "two_valued": _say("{s} has two values only: a curve has no meaning for it."),
    "unchecked": _say("{s} stays as it is: the plan declares no check for it."),
    "straight": lambda r: f"{r.subject} stays as it is: {_checks(r)}.",
    "bent": lambda r: f"{r.subject} goes to the ladder: {_checks(r)}.",
    "rung_not_applicable": lambda r: f"{r.subject} cannot enter {_rung(r)}: {r.because}.",
    "rung_fails": lambda r: f"{r.subject} {_rung(r)} does not pass: {_checks(r)}.",
    "rung_adopted": lambda r: f"{r.subject} enters {_rung(r)}: {_checks(r)}.",
    "stays_unmended": _say("{s} stays as it is although no rung passes; its check still fails."),
    "leaves_unmended": _say("{s} leaves: no rung of the ladder passes."),
    "outcome_stays": lambda r: f"{r.subject} stays on its own scale: {_checks(r)}.",
    "outcome_fails": lambda r: f"{r.subject} goes to its ladder: {_checks(r)}.",
    "outcome_unmended": _say("{s} stays on its own scale although no rung passes."),
    # dependence
    "leaves_constant": lambda r: f"{r.subject} leaves: it is constant in the rows in use ({_dependence(r)}).",
    "leaves_dependent": lambda r: (
        f"{r.subject} leaves: it is determined by others exactly ({_dependence(r)})."
    ),
    "stops_constant": lambda r: (
        f"The run stops: {r.subject} is constant in the rows in use and a rule keeps it ({_dependence(r)})."
    ),
    "stops_dependent": lambda r: (
        f"The run stops: {_dependence(r)} holds exactly and rules keep every predictor in it."
    ),
    # keep rules
    "kept_always": lambda r: f"{r.subject} stays by rule: {r.because}",
    "kept_below_bound": lambda r: (
        f"{r.subject} stays by rule, p {p_value(r.evidence.get('p'))} is not above "
        f"{limit_text(r.limit)}: {r.because}"
        if r.evidence.get("p") is not None
        else f"{r.subject} stays by rule: {r.because}"
    ),
    "kept_last_of_group": lambda r: f"{r.subject} stays by rule as the last of its group: {r.because}",
    "kept_for_product": lambda r: f"{r.subject} stays: the product {r.because} is in the model.",
    # collinearity
    "joint_signal": lambda r: (
        f"The model is significant (p {p_value(r.evidence['p_model'])}) and no predictor is: "
        f"{r.subject} are examined (correlation {number(r.evidence['r'])})."
    ),
    "left_to_selection": _pair_says("{s} is left to selection: {pair}; only {partner} is significant."),
    "weaker_leaves": _pair_says(
        "{s} leaves: {pair}; beside it p is {p} for {s} and {partner_p} for {partner}."
    ),
    "both_leave": _pair_says(
        "{s} leaves: {pair}; neither is significant, together or alone "
        "(alone p {alone}, {partner} {partner_alone})."
    ),
    "significant_alone_stays": _pair_says(
        "{s} leaves: {pair}; neither is significant beside the other; alone p is {alone} "
        "for {s} and {partner_alone} for {partner}."
    ),
    "both_stay": _pair_says("{s} and {partner} stay: both are significant and the plan keeps both."),
    "small_change_both_stay": _pair_says(
        "{s} and {partner} stay: both are significant, and without {s} {change}: a small change."
    ),
    "large_change_both_stay": _pair_says(
        "{s} and {partner} stay: both are significant, and without {s} {change}: a large change."
    ),
    "large_change_weaker_leaves": _pair_says(
        "{s} leaves: {pair}; both are significant, {s} is the weaker, and without it {change}: a large change."
    ),
    "small_change_weaker_leaves": _pair_says(
        "{s} leaves: {pair}; both are significant, {s} is the weaker, and without it {change}: a small change."
    ),
    # influence
    "none_flagged": _say("No row passes a limit of influence."),
    "exact_fit": _say("Influence is not examined: the model fits without residuals."),
    "flagged_rows_stay": lambda r: (
        f"{plural(r.evidence['rows'], 'flagged row')} "
        f"{'stays' if r.evidence['rows'] == 1 else 'stay'}: none alone changes the answer as much as the plan "
        f"declares (largest change of a coefficient {number(r.evidence['largest_change_coefficient'])} "
        "standard errors)."
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
        f"Row {r.subject} leaves: without it the significance of {r.evidence['significance_changes']} changes."
    ),
    "row_leaves_sign_changes": lambda r: (
        f"Row {r.subject} leaves: without it the sign of {r.evidence['sign_changes']} changes."
    ),
    # selection
    "model_significant": lambda r: f"The model as a whole is significant: {_against(r)}.",
    "model_weak": lambda r: f"The model as a whole is not significant: {_against(r)}.",
    "weak_without_theory": _say("No theory backs a predictor, so the mean is the answer."),
    "near_miss": lambda r: (
        f"{r.subject} is a near miss: p {p_value(r.evidence['p'])}; "
        + (
            f"an effect of the observed size would need {number(r.evidence['rows_needed'])} rows "
            f"for power {number(r.evidence['power'], 2)}."
            if r.evidence.get("rows_needed") is not None
            else "no sample of a practical size would show an effect so small."
        )
    ),
    "full_model_stands": _say("The full model stands: the plan selects nothing."),
    "leaves_backward": _p_says("{s} leaves: {p}."),
    "leaves_aic": lambda r: (
        f"{r.subject} leaves: AIC falls by {number(-float(str(r.evidence['change_aic'])))}."
    ),
    "leaves_bic": lambda r: (
        f"{r.subject} leaves: BIC falls by {number(-float(str(r.evidence['change_bic'])))}."
    ),
    "not_in_best_subset": _say("{s} leaves: it is not in the best subset."),
    "no_subset": _say(
        "No lawful subset has only significant or kept predictors; {s} is one of those searched."
    ),
    "stays": _p_says("{s} stays: {p}."),
    "stays_above_alpha": _p_says("{s} stays although {p}."),
    "mean_is_answer": _say("No predictor is left: the mean of {s} is the answer."),
    # final checks
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


def sentence(ruling: Ruling) -> str:
    """The one plain sentence of a ruling, made from its ground and evidence."""
    said = SENTENCES[ruling.ground](ruling)
    return said if said.endswith((".", "…")) else said + "."


def cautions(
    *,
    status: str,
    cap_reached: bool,
    exact: bool,
    unmended: tuple[str, ...],
    failed: list[Ruling],
    selected: bool,
    filled: bool,
    rows_per_coefficient: float,
    alternatives: int,
) -> tuple[str, ...]:
    """What must be said beside an answer: what this run calls for first, then what always holds."""
    said: list[str] = []
    if cap_reached:
        said.append(
            "More rows change the answer than the plan allows to remove: the answer hangs on single rows."
        )
    if exact:
        said.append("The model fits without residuals: see whether the outcome is computed from a predictor.")
    said += [f"{name} still bends: no rung of the ladder mends it." for name in unmended]
    said += [sentence(ruling) for ruling in failed]
    if rows_per_coefficient < FEW_ROWS_PER_COEFFICIENT:
        said.append(
            f"There are {number(rows_per_coefficient)} rows for each coefficient; below "
            f"{FEW_ROWS_PER_COEFFICIENT} coefficients are unstable (common practice)."
        )
    if filled:
        said.append("Filled cells count as observed, so standard errors are somewhat too small.")
    if selected and status == "adopted":
        said.append("The p-values come after a selection and are optimistic; so is R².")
    if alternatives:
        said.append("Read the declared alternatives beside this answer.")
    return (*said, *ALWAYS)


# Rows per coefficient below which estimates are called unstable (common practice: 10 to 20).
FEW_ROWS_PER_COEFFICIENT = 10

ALWAYS = (
    "Association is not causation.",
    "The equation holds inside the range of the data it comes from.",
    "Decisions on people's health, safety, credit, work or housing need qualified review and local rules.",
)

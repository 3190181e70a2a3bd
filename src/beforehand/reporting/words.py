"""Every word of the report that does not stand in the lock: headings, captions, sentences.

A translation of the report is another file like this one. What was done stands in the past tense.
"""

from __future__ import annotations

from collections.abc import Sequence

from beforehand.screen.digits import count, figure, listed, percent, trimmed

TITLES = {
    "key": "Key finding",
    "text": "Methods and results, in words to paste",
    "question": "The question and what was promised",
    "variables": "The variables one by one",
    "correlations": "How the variables go together",
    "building": "How the model was built",
    "removed": "What was removed, and why",
    "checks": "The assumptions, before and after",
    "answer": "The final model",
    "pictures": "The final model in pictures",
    "honest": "Naive figures beside honest ones",
    "fragile": "How little would have to change",
    "alternatives": "The alternatives that the plan declared",
    "rehearsal": "What the plan does to worlds whose truth is known",
    "refresh": "On refreshed data",
    "record": "The record",
    "references": "Methods and where they come from",
}
FROM_ZERO = "Variation is measured from 0, as the fit has no intercept."
APPENDIX = "Details"
CAUTIONS = "Cautions"
CONTENTS = "Contents"
SKIP = "Skip to the key finding"
TRACED = (
    "Numbers in brackets name the ruling (R), fit (F) or check (C) of the lockfile on which a sentence rests."
)

STEPS = {
    "missing_data": "Missing data",
    "transforms": "Transforms",
    "collinearity": "Collinearity",
    "influence": "Influence of single rows",
    "selection": "Selection",
    "final_checks": "Final checks",
    "full_model": "The full model",
}

STATUS = {
    "adopted": "a model was adopted",
    "mean_only": "no predictor stood, and the mean was the answer",
    "inconclusive": "the model as a whole was not significant, and the answer is inconclusive",
    "stopped": "a rule of the plan stopped the run, and there is no answer",
}

METHODS_OF_SELECTION = {
    "backward": "backward elimination: the predictor with the largest p above {alpha} left, the model was "
    "fitted again, and so on",
    "backward_aic": "backward elimination by AIC",
    "backward_bic": "backward elimination by BIC",
    "best_subset": "a search of all subsets for the largest adjusted R² among those whose predictors were "
    "significant or kept",
    "none": "no selection: the full model stood",
}

FILLS = {
    "mean": "with the mean",
    "median": "with the median",
    "most_common": "with the most common value",
    "value": "with a value that the plan declares",
    "regression": "by regression on the other predictors",
}

CHECK_NAMES = {
    "curvature": "Straight relation",
    "reset": "Form of the model (RESET)",
    "breusch_pagan": "Equal spread (Breusch–Pagan)",
    "white": "Equal spread (White)",
    "jarque_bera": "Normal residuals (Jarque–Bera)",
    "shapiro_wilk": "Normal residuals (Shapiro–Wilk)",
    "durbin_watson": "Independence (Durbin–Watson)",
    "breusch_godfrey": "Independence (Breusch–Godfrey)",
}

VERDICTS = {"passed": "passed", "failed": "failed", "not_applicable": "not made"}

ERRORS = {
    "classical": "classical standard errors",
    "hc0": "heteroscedasticity-consistent standard errors (HC0)",
    "hc1": "heteroscedasticity-consistent standard errors (HC1)",
    "hc2": "heteroscedasticity-consistent standard errors (HC2)",
    "hc3": "heteroscedasticity-consistent standard errors (HC3)",
    "cluster": "cluster-robust standard errors",
    "autocorrelation": "autocorrelation-consistent standard errors",
}


def sealed(state: str, seals: int | None, before_first_look: bool | None) -> str:
    """How the plan stands to its seals."""
    first = {
        "sealed": "The plan was sealed before this run and has not changed since.",
        "unsealed": "The plan was not sealed: nothing shows that its rules came before the results.",
        "amended": f"The plan was sealed and then amended; {count(seals or 0, 'seal')} stand in its chain.",
        "deviates": "The plan was sealed and then changed without an amendment: this run deviates from it.",
    }[state]
    if before_first_look is None or state == "unsealed":
        return first
    looked = "precedes" if before_first_look else "does not precede"
    return f"{first} The first seal {looked} the first look at the outcome."


def analysed(rows: int, read: int, outcome: str, predictors: int) -> str:
    """Which rows and predictors were analysed."""
    return (
        f"Of {count(read, 'row')} read, {rows:,} were analysed by ordinary least squares with {outcome} as "
        f"the outcome and {count(predictors, 'candidate predictor')}."
    )


def decided_before(decisions: str) -> str:
    """That the rules were written down."""
    return (
        f"Every modelling decision was a rule of a written plan (digest of its decisions {decisions[:19]}…)."
    )


def steps_followed(steps: Sequence[str]) -> str:
    """Which steps were followed."""
    if not steps:
        return "The full model was fitted once, and nothing was removed."
    names = [STEPS[step].lower() for step in steps if step in STEPS]
    return f"The steps were, in this order, {listed(names)}; each change was followed by a new fit."


def selected_by(method: str, alpha: float) -> str:
    """How predictors left."""
    return f"Predictors were selected by {METHODS_OF_SELECTION[method].format(alpha=trimmed(alpha))}."


def kept(names: Sequence[str]) -> str:
    """What theory kept."""
    verb = "was" if len(names) == 1 else "were"
    return f"{listed(list(names))} {verb} kept by rules that rest on theory." if names else ""


def filled(predictor: str, method: str, cells: int) -> str:
    """A fill."""
    verb = "was" if cells == 1 else "were"
    return f"{count(cells, 'missing cell')} of {predictor} {verb} filled {FILLS.get(method, method)}."


def missing(share_left: int, rows: int) -> str:
    """Rows that left for missing cells."""
    verb = "was" if share_left == 1 else "were"
    return f"{count(share_left, 'incomplete row')} of {rows:,} {verb} left out." if share_left else ""


def rows_removed(number: int, share: float) -> str:
    """Influential rows."""
    if not number:
        return "No row was removed for its influence."
    verb = "was" if number == 1 else "were"
    return f"{count(number, 'row')} ({percent(share)}) {verb} removed for influence on the answer."


def errors_used(errors: str, level: str) -> str:
    """Standard errors and intervals."""
    return f"The final table has {ERRORS.get(errors, errors)} and {level} intervals."


def many_tests(method: str) -> str:
    """Adjustment for multiplicity."""
    names = {"holm": "Holm's method", "benjamini_hochberg": "the method of Benjamini and Hochberg"}
    return f"p-values of focal predictors were also adjusted by {names[method]}." if method in names else ""


def explained(r_squared: float, rows: int, predictors: int) -> str:
    """How much was explained and how much was not."""
    return (
        f"{count(predictors, 'predictor')} together went with {percent(r_squared)} of the variation over "
        f"{count(rows, 'row')}; {percent(1 - r_squared)} stayed unexplained."
    )


def whole_model(f: float, df: tuple[int, int], p: str) -> str:
    """The F test of the model."""
    return f"The model as a whole had F({df[0]:,}, {df[1]:,}) = {figure(f)}, {p}."


def effect(term: str, coefficient: str, low: str, high: str, level: str, p: str, per: str) -> str:
    """One coefficient as a result."""
    unit = f" per {per}" if per and per != "as transformed" else " per unit as transformed" if per else ""
    return f"{term}: {coefficient}{unit} ({level} interval {low} to {high}, {p})."


def left(names: Sequence[str]) -> str:
    """Predictors that left."""
    if not names:
        return "No predictor left the model."
    return f"{listed(list(names), 12)} left the model."


def alternatives(holds: int, of: int) -> str:
    """Whether declared alternatives hold."""
    return f"The answer held in {holds} of {count(of, 'declared alternative')}." if of else ""


def robust_to_unseen(predictor: str, value: float, at_alpha: float | None, alpha: float) -> str:
    """How strong an unseen common cause would have to be (Cinelli & Hazlett 2020)."""
    said = (
        f"{predictor}: an unseen common cause would have to explain {percent(value)} of what is left of both "
        f"the outcome and {predictor} to bring its effect to 0"
    )
    if at_alpha is None:
        return f"{said}."
    return f"{said}, and {percent(at_alpha)} of both to take its significance at {trimmed(alpha)}."


def refreshed(verdict: str) -> str:
    """What a refresh came to."""
    return {
        "holds": "On refreshed data the answer held.",
        "moved": "On refreshed data the answer was of the same kind, with other numbers.",
        "broken": "On refreshed data the answer did not stand.",
    }.get(verdict, "")


def made_from(lock: str, digest: str) -> str:
    """What the report was made from."""
    return f"Made from {lock}, digest {digest}, and from nothing else but the records that stand beside it."


def interval_title(level: str) -> str:
    """Head of the column of intervals."""
    return f"{level} interval"

"""One table: how a change of each field of the plan language is classed, and why.

The keys are the places of the language without the names in them: ``predictors.range`` is the range
of any predictor. A test demands an entry for every field that the models have.
"""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.comparing.rules import ANY_OTHER, Always, Ends, Inside, Items, Number, Rule, Words

_INSIDE = Inside()
_TEXT = Always(grade="wording", why="no number and no ruling depends on it")
_READING = Always(grade="different", why="the file may be read as another table")
_POPULATION = Always(grade="different", why="another population is meant, not another standard")
_EXPECTED = Always(grade="different", why="rehearsal supposes another world; the run is not touched")
_EXPECTED_OF = Items(
    came="different",
    went="different",
    why_came=_EXPECTED.why,
    why_went=_EXPECTED.why,
    order=None,
    why_changed=_EXPECTED.why,
)
_VALUES = Ends(looser="more values are accepted", stricter="fewer values are accepted")
_CHECK = Words(
    order=(ANY_OTHER, "skip"), looser="the check is no longer made", stricter="the check is now made"
)
# A check that fails more readily finds more to answer for: its level runs the other way than alpha.
_LEVEL_OF_CHECK = Number(
    up="stricter", looser="the check fails less readily", stricter="the check fails more readily"
)
_OTHER_TEST = Always(grade="different", why="another test judges")
_FLAG = Number(
    up="stricter",
    looser="more rows are flagged and may leave",
    stricter="fewer rows are flagged and may leave",
)
_REMOVE = Number(up="stricter", looser="rows leave more easily", stricter="rows leave less easily")
_REMOVE_TOO = Words(
    order=(False, True), looser="one more reason removes a row", stricter="one reason less removes a row"
)
_FOUND = Words(
    order=("stop", "robust_errors", "report"),
    looser="a failed check has less weight",
    stricter="a failed check has more weight",
)
_WEAKER = Words(
    order=("remove_weaker", "keep_both"),
    looser="both of two predictors that say the same may stay",
    stricter="the weaker of two predictors that say the same leaves",
)
_TOLERATED = Number(
    up="looser",
    looser="fewer pairs that say the same are examined",
    stricter="more pairs that say the same are examined",
)
# What a large change calls for is itself a field, so that no direction holds in every plan.
_LARGE = Always(grade="different", why="which way it works hangs on if_large and if_small")
_MORE_FORMS = Items(
    came="looser",
    went="stricter",
    why_came="one more form may be tried until one passes",
    why_went="fewer forms may be tried until one passes",
    why_order="the first form that passes is adopted",
)

GRADES: Mapping[str, Rule] = {
    "language": Always(grade="different", why="another version of the language"),
    "title": _TEXT,
    "question": _TEXT,
    "written_by": _TEXT,
    # ---- the table ----
    "data": _INSIDE,
    "data.file": Always(grade="different", why="another file is read"),
    "data.row_label": Always(grade="different", why="rows go by other labels"),
    "data.missing_codes": Items(
        came="looser",
        went="stricter",
        why_came="more cells may be set aside as missing",
        why_went="fewer cells may be set aside as missing",
        order="wording",
        why_order="their order means nothing",
    ),
    "data.labels_in_lock": Always(grade="wording", why="only how the lock shows labels"),
    "data.separator": _READING,
    "data.decimal": _READING,
    "data.encoding": _READING,
    "purpose": Always(grade="different", why="the answer is for something else"),
    "eligibility": Items(
        came="different",
        went="different",
        why_came="fewer rows are the population",
        why_went="more rows may be the population",
        why_order="the record counts the rows in this order",
    ),
    "eligibility.column": _POPULATION,
    "eligibility.is": _POPULATION,
    "eligibility.is_not": _POPULATION,
    "eligibility.one_of": Items(
        came="different",
        went="different",
        why_came="another population is meant, not another standard",
        why_went="another population is meant, not another standard",
        order="wording",
        why_order="their order means nothing",
    ),
    "eligibility.at_least": _POPULATION,
    "eligibility.at_most": _POPULATION,
    "eligibility.above": _POPULATION,
    "eligibility.below": _POPULATION,
    "eligibility.because": _TEXT,
    "derive": Items(
        came="different",
        went="different",
        why_came="one more column is computed",
        why_went="a column is no longer computed",
        why_order="columns are computed in this order",
    ),
    "derive.column": Always(grade="different", why="another column is computed"),
    "derive.from": Always(grade="different", why="the column holds other values"),
    "derive.unit": _TEXT,
    "derive.because": _TEXT,
    # ---- the variables ----
    "outcome": _INSIDE,
    "outcome.column": Always(grade="different", why="something else is explained"),
    "outcome.unit": _TEXT,
    # A larger effect is easier to plan for and harder to find: both ways at once.
    "outcome.smallest_effect_that_matters": Always(grade="different", why="another effect is said to matter"),
    "outcome.range": _VALUES,
    "outcome.transforms": _MORE_FORMS,
    # One more candidate is one more chance to find something, one more adjustment is one chance less.
    "predictors": Items(
        came="different",
        went="different",
        why_came="one more predictor is in the question",
        why_went="a predictor is no longer in the question",
        why_order="ties go to the earlier predictor",
    ),
    "predictors.column": Always(grade="different", why="another column is meant"),
    "predictors.unit": _TEXT,
    "predictors.kind": Always(grade="different", why="the column is read as something else"),
    "predictors.range": _VALUES,
    "predictors.role": Always(grade="different", why="the question puts it in another place"),
    "predictors.levels": Items(
        came="different",
        went="different",
        why_came="one more level is told apart",
        why_went="a level is no longer accepted",
        why_order="levels stand in the model in this order",
    ),
    "predictors.baseline": Always(grade="different", why="levels are compared with another one"),
    "predictors.because": _TEXT,
    "products": Items(
        came="different",
        went="different",
        why_came="one more product is in the model",
        why_went="a product is no longer in the model",
        why_order="ties go to the earlier product",
        why_changed="its two predictors stand the other way round",
    ),
    # A kept predictor stays whatever its evidence: less is asked of the model.
    "keep": Items(
        came="looser",
        went="stricter",
        why_came="something may stay without passing",
        why_went="it must now pass like any other",
        why_order="the record lists the rules in this order",
    ),
    "keep.predictor": Always(grade="different", why="its two predictors stand the other way round"),
    "keep.rule": Words(
        order=(ANY_OTHER, "always"), looser="it stays whatever its p", stricter="it stays only up to a p"
    ),
    "keep.rule.unless_p_above": Number(
        up="looser", looser="it stays with a larger p", stricter="it leaves with a smaller p"
    ),
    "keep.because": _TEXT,
    "keep.source": _TEXT,
    # An expected sign is a commitment that the answer is held against.
    "keep.expected_sign": Words(
        order=(ANY_OTHER, None),
        looser="no sign is expected any longer",
        stricter="the answer is held against a sign",
        different="the other sign is expected",
    ),
    "keep.at_least_one_of": Items(
        came="different",
        went="different",
        why_came="another group is protected",
        why_went="another group is protected",
        order="wording",
        why_order="their order means nothing",
    ),
    # ---- the standard ----
    "alpha": Number(
        up="looser", looser="predictors pass more easily", stricter="predictors pass less easily"
    ),
    "multiplicity": Words(
        order=("holm", "benjamini_hochberg", "none"),
        looser="several focal predictors pass more easily",
        stricter="several focal predictors pass less easily",
    ),
    "intercept": Always(grade="different", why="another form of model is fitted"),
    # A step may remove predictors or rows, or find fault: without it less is asked, or less is allowed.
    "steps": Items(
        came="different",
        went="different",
        why_came="one more step is taken",
        why_went="a step is no longer taken",
        why_order="each step works on what the one before leaves",
    ),
    "missing_data": _INSIDE,
    "missing_data.remove_predictor_above": Number(
        up="looser", looser="emptier predictors stay", stricter="emptier predictors leave"
    ),
    # A filled cell counts as observed, which makes the answer look surer than it is.
    "missing_data.fill": Items(
        came="looser",
        went="stricter",
        why_came="made-up cells count as observed",
        why_went="only observed cells count",
        order=None,
        why_changed="cells are filled otherwise",
    ),
    "missing_data.fill.value": Always(grade="different", why="cells are filled with another value"),
    "missing_data.otherwise": Always(grade="different", why="incomplete rows are treated otherwise"),
    "missing_data.out_of_range": Words(
        order=("fault", "missing"),
        looser="impossible values pass as missing",
        stricter="impossible values are faults",
    ),
    "assumptions": _INSIDE,
    "assumptions.curvature": _CHECK,
    "assumptions.curvature.alpha": _LEVEL_OF_CHECK,
    "assumptions.equal_spread": _CHECK,
    "assumptions.equal_spread.test": _OTHER_TEST,
    "assumptions.equal_spread.alpha": _LEVEL_OF_CHECK,
    "assumptions.normal_residuals": _CHECK,
    "assumptions.normal_residuals.test": _OTHER_TEST,
    "assumptions.normal_residuals.alpha": _LEVEL_OF_CHECK,
    "assumptions.independence": _CHECK,
    "assumptions.independence.test": _OTHER_TEST,
    "assumptions.independence.lags": Always(grade="different", why="other neighbours are looked at"),
    "assumptions.independence.alpha": _LEVEL_OF_CHECK,
    "assumptions.independence.in_order_of": Words(
        order=(ANY_OTHER, None),
        looser="the check is no longer made",
        stricter="the check is now made",
        different="rows follow each other otherwise",
    ),
    "assumptions.independence.between": Ends(
        looser="the statistic has more room", stricter="the statistic has less room"
    ),
    "transforms": _INSIDE,
    "transforms.when": Items(
        came="looser",
        went="stricter",
        why_came="other forms are tried on more occasions",
        why_went="other forms are tried on fewer occasions",
        order="wording",
        why_order="their order means nothing",
    ),
    "transforms.try": _MORE_FORMS,
    "transforms.if_none_works": Words(
        order=("remove_predictor", "keep_as_is"),
        looser="a bent predictor stays",
        stricter="a bent predictor leaves",
    ),
    "collinearity": _INSIDE,
    "collinearity.examine_when": _INSIDE,
    "collinearity.examine_when.vif_above": _TOLERATED,
    "collinearity.examine_when.correlation_above": _TOLERATED,
    "collinearity.when_one_significant": Words(
        order=("remove_other", "leave_to_selection"),
        looser="the one that is not significant may stay",
        stricter="the one that is not significant leaves",
    ),
    "collinearity.when_both_significant": Words(
        order=("remove_weaker", "compare", "keep_both"),
        looser="both of two predictors that say the same stay more easily",
        stricter="the weaker of two predictors that say the same leaves more easily",
    ),
    "collinearity.large_change": _INSIDE,
    "collinearity.large_change.r_squared": _LARGE,
    "collinearity.large_change.coefficient": _LARGE,
    "collinearity.if_large": _WEAKER,
    "collinearity.if_small": _WEAKER,
    "influence": _INSIDE,
    "influence.flag_when": _INSIDE,
    "influence.flag_when.cooks_distance": _FLAG,
    "influence.flag_when.leverage": _FLAG,
    "influence.flag_when.studentized_residual": _FLAG,
    "influence.flag_when.dffits": _FLAG,
    "influence.flag_when.dfbetas": _FLAG,
    "influence.flag_when.covariance_ratio": _FLAG,
    "influence.remove_when": _INSIDE,
    "influence.remove_when.coefficient": _REMOVE,
    "influence.remove_when.r_squared": _REMOVE,
    "influence.remove_when.significance_changes": _REMOVE_TOO,
    "influence.remove_when.sign_changes": _REMOVE_TOO,
    "influence.at_most": Number(up="looser", looser="more rows may leave", stricter="fewer rows may leave"),
    "influence.record_at_most": Always(grade="different", why="the record is longer or shorter"),
    "selection": _INSIDE,
    "selection.method": Always(grade="different", why="predictors are chosen in another way"),
    "weak_model": _INSIDE,
    "weak_model.with_theory": Words(
        order=("report", "try_selection"),
        looser="a weak model is searched further",
        stricter="a weak model is only reported",
    ),
    "weak_model.without_theory": Always(grade="different", why="a weak model ends otherwise"),
    "weak_model.near": Number(
        up="looser", looser="more predictors are near misses", stricter="fewer predictors are near misses"
    ),
    "final_checks": _INSIDE,
    "final_checks.if_spread_unequal": _FOUND,
    "final_checks.if_not_normal": _FOUND,
    "final_checks.if_curved": _FOUND,
    "final_checks.if_dependent": _FOUND,
    "errors": Always(grade="different", why="standard errors are computed otherwise"),
    "errors.cluster_by": Always(grade="different", why="other rows may hang together"),
    "errors.autocorrelation_lags": Always(grade="different", why="other neighbours may hang together"),
    # ---- beside the run ----
    "expects": _EXPECTED,
    "expects.residual_sd": _EXPECTED,
    "expects.slopes": _EXPECTED_OF,
    "expects.predictors": _EXPECTED_OF,
    "expects.predictors.mean": _EXPECTED,
    "expects.predictors.sd": _EXPECTED,
    "expects.predictors.shares": _EXPECTED_OF,
    "expects.correlations": Items(
        came="different",
        went="different",
        why_came=_EXPECTED.why,
        why_went=_EXPECTED.why,
        order="wording",
        why_order="their order means nothing",
    ),
    "expects.correlations.between": _EXPECTED,
    "expects.correlations.r": _EXPECTED,
    "rehearsal": _INSIDE,
    "rehearsal.replicates": Number(
        up="stricter",
        looser="the plan is rehearsed less often",
        stricter="the plan is rehearsed more often",
    ),
    "rehearsal.seed": Always(grade="different", why="rehearsal draws other numbers"),
    "rehearsal.scenarios": Items(
        came="stricter",
        went="looser",
        why_came="the plan is rehearsed in one more world",
        why_went="the plan is rehearsed in fewer worlds",
        order="wording",
        why_order="their order means nothing",
    ),
    "rehearsal.folds": Always(grade="different", why="rehearsal leaves out other parts of the rows"),
    "rehearsal.leave_out": Always(grade="different", why="rehearsal leaves out other parts of the rows"),
    # Each alternative is one more way in which the answer can be shown not to hold.
    "alternatives": Items(
        came="stricter",
        went="looser",
        why_came="the answer is held against one more plan",
        why_went="the answer is held against fewer plans",
        order=None,
        why_changed="the answer is held against another plan",
    ),
    "refresh": _INSIDE,
    "refresh.coefficient": Number(
        up="looser",
        looser="an answer holds through larger moves",
        stricter="an answer holds through smaller moves",
    ),
    "refresh.r_squared": Number(
        up="looser",
        looser="an answer holds through larger moves",
        stricter="an answer holds through smaller moves",
    ),
    "refresh.rulings": Words(
        order=("same", "any"),
        looser="an answer holds whatever the verdicts",
        stricter="an answer holds only with the same verdicts",
    ),
    "refresh.learned": Always(grade="different", why="new data is prepared in another way"),
    "amendments": Items(
        came="wording",
        went="wording",
        why_came="an account of a change, not a change",
        why_went="an account of a change, not a change",
        order="wording",
        why_order="an account of changes, not a change",
    ),
    "amendments.date": _TEXT,
    "amendments.why": _TEXT,
    "amendments.kind": _TEXT,
    "amendments.seen": _TEXT,
    "amendments.expected_effect": _TEXT,
}

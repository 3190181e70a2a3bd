"""Branches of the steps that no published table walks, judged by statsmodels and scipy on the same rows."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.stats.diagnostic import acorr_breusch_godfrey
from statsmodels.stats.stattools import durbin_watson
from tests_cases import rulings, run_on, terms

from beforehand import DataError

QUIET = {"curvature": "skip", "equal_spread": "skip", "normal_residuals": "skip", "independence": "skip"}


def invented(seed=1, n=120):
    """Invented columns: two predictors that matter, one that does not, an order and groups."""
    rng = np.random.default_rng(seed)
    a, b, c = rng.normal(10, 2, n), rng.normal(5, 1, n), rng.normal(0, 1, n)
    y = 3 + 0.8 * a - 1.2 * b + rng.normal(0, 1, n) * (0.3 + 0.1 * a)
    day = rng.permutation(n)
    return pd.DataFrame({"y": y, "a": a, "b": b, "c": c, "day": day, "site": np.arange(n) % 12})


def judge(frame, names, cov="nonrobust", **options):
    """The same model by statsmodels."""
    return sm.OLS(frame["y"], sm.add_constant(frame[names])).fit(cov_type=cov, use_t=True, **options)


PREDICTORS = [{"column": "a"}, {"column": "b"}, {"column": "c"}]


@pytest.mark.parametrize("form", ["hc0", "hc1", "hc2", "hc3"])
def test_robust_errors_from_the_start(form):
    """Every p that selection sees is the robust one; the final table is that of statsmodels."""
    frame = invented()
    done = run_on(frame, "y", predictors=PREDICTORS, errors=form, steps=["selection"])
    kept = [name for name in done.lock.answer.terms if name.predictor]
    found = judge(frame, [term.term for term in kept], form.upper())
    for term in kept:
        assert term.standard_error == pytest.approx(found.bse[term.term], rel=1e-9)
        assert term.p == pytest.approx(found.pvalues[term.term], rel=1e-7)
    assert all(fit.errors == form for fit in done.lock.fits)


def test_clustered_errors():
    """Errors by site, with t on the number of sites less one (statsmodels' cluster with use_t)."""
    frame = invented(2)
    done = run_on(frame, "y", predictors=PREDICTORS, errors={"cluster_by": "site"}, steps=["selection"])
    kept = [term.term for term in done.lock.answer.terms if term.predictor]
    found = judge(frame, kept, "cluster", cov_kwds={"groups": frame["site"], "df_correction": True})
    for name in kept:
        assert terms(done)[name].standard_error == pytest.approx(found.bse[name], rel=1e-8)
        assert terms(done)[name].p == pytest.approx(found.pvalues[name], rel=1e-6)


def test_unequal_spread_calls_for_robust_errors():
    """Both tables stay in the record, and the final one has HC3 errors."""
    frame = invented(3, n=400)
    done = run_on(
        frame, "y", predictors=PREDICTORS, steps=["selection", "final_checks"],
        assumptions={**QUIET, "equal_spread": {"test": "breusch_pagan"}},
        final_checks={"if_spread_unequal": "robust_errors"},
    )  # fmt: skip
    assert ("the model", "robust_errors_used") in rulings(done, "final_checks")
    kept = [term.term for term in done.lock.answer.terms if term.predictor]
    assert terms(done)["a"].standard_error == pytest.approx(judge(frame, kept, "HC3").bse["a"], rel=1e-9)
    assert {fit.errors for fit in done.lock.fits} == {"classical", "hc3"}


@pytest.mark.filterwarnings("ignore:acorr_breusch_godfrey:FutureWarning")
@pytest.mark.parametrize("action", ["report", "stop"])
def test_rows_in_order(action):
    """Residuals that hang together along the declared order are found, and the plan's action taken."""
    frame = invented(4, n=200).sort_values("day").reset_index(drop=True)
    frame["y"] += np.cumsum(np.random.default_rng(4).normal(0, 1, 200))
    shuffled = frame.sample(frac=1, random_state=1)
    order = {"in_order_of": "day", "test": "breusch_godfrey", "lags": 2}
    done = run_on(
        shuffled, "y", predictors=PREDICTORS, steps=["final_checks"],
        assumptions={**QUIET, "independence": order}, final_checks={"if_dependent": action},
    )  # fmt: skip
    (check,) = [one for one in done.lock.checks.assumptions if one.check == "breusch_godfrey"]
    lm, p, *_ = acorr_breusch_godfrey(judge(frame, ["a", "b", "c"]), nlags=2)
    assert (check.statistic, check.p) == (pytest.approx(lm, rel=1e-7), pytest.approx(p, rel=1e-6))
    assert done.status == ("stopped" if action == "stop" else "adopted")


def test_durbin_watson_within_its_declared_range():
    """The statistic in the declared order, held against the plan's own range (statsmodels)."""
    frame = invented(5).sort_values("day")
    order = {"in_order_of": "day", "test": "durbin_watson", "between": [1.5, 2.5]}
    done = run_on(
        frame,
        "y",
        predictors=PREDICTORS,
        steps=["final_checks"],
        assumptions={**QUIET, "independence": order},
    )
    (check,) = [one for one in done.lock.checks.assumptions if one.check == "durbin_watson"]
    found = durbin_watson(judge(frame, ["a", "b", "c"]).resid)
    assert check.statistic == pytest.approx(found, rel=1e-9)
    assert ("the model", "independence_passes") in rulings(done, "final_checks")


def test_an_outcome_under_its_logarithm_comes_back_by_smearing():
    """A skewed outcome goes to its ladder; the way back is Duan's (1983) mean of exp(residual)."""
    rng = np.random.default_rng(6)
    a = rng.uniform(1, 4, 150)
    frame = pd.DataFrame({"y": np.exp(0.5 + 0.6 * a + rng.normal(0, 0.5, 150)), "a": a})
    done = run_on(
        frame, "y", steps=["transforms", "selection"],
        assumptions={**QUIET, "normal_residuals": {"test": "jarque_bera"}},
        outcome={"column": "y", "transforms": ["log"]},
    )  # fmt: skip
    answer = done.lock.answer
    assert answer.outcome.transform == "log"
    fit = sm.OLS(np.log(frame["y"]), sm.add_constant(frame["a"])).fit()
    assert terms(done)["a"].coefficient == pytest.approx(fit.params["a"], rel=1e-9)
    assert answer.outcome.smearing == pytest.approx(float(np.exp(fit.resid).mean()), rel=1e-9)


def test_a_learned_power_of_a_predictor():
    """A bent relation is mended by a power to two decimals, which the record names."""
    rng = np.random.default_rng(7)
    a = rng.uniform(1, 9, 200)
    frame = pd.DataFrame({"y": 2 + 3 * a**0.3 + rng.normal(0, 0.05, 200), "a": a})
    done = run_on(
        frame, "y", steps=["transforms", "selection"],
        assumptions={**QUIET, "curvature": {}}, transforms={"when": ["curvature"], "try": ["box_cox"]},
    )  # fmt: skip
    (term,) = [one for one in done.lock.answer.terms if one.predictor == "a"]
    assert term.transform == "box_cox"
    turned = (a**term.exponent - 1) / term.exponent if term.exponent else np.log(a)
    fit = sm.OLS(frame["y"], sm.add_constant(turned)).fit()
    assert term.coefficient == pytest.approx(fit.params.iloc[1], rel=1e-9)
    assert -0.5 < term.exponent < 1.0


@pytest.mark.parametrize(("name", "value"), [("mean", np.mean), ("median", np.median)])
def test_fills(name, value):
    """Missing cells take the mean or median of the observed ones; the fit is that of the filled table."""
    frame = invented(8)
    frame.loc[:9, "b"] = np.nan
    done = run_on(
        frame, "y", predictors=PREDICTORS, missing_data={"fill": {"b": name}}, steps=["missing_data"]
    )
    filled = frame.fillna({"b": value(frame["b"].dropna())})
    assert terms(done)["b"].coefficient == pytest.approx(judge(filled, ["a", "b", "c"]).params["b"], rel=1e-9)
    assert [(fill.predictor, fill.method, fill.cells) for fill in done.lock.checks.fills] == [("b", name, 10)]


def test_a_fill_by_regression():
    """Missing cells take the fitted value of a regression on the other complete predictors."""
    frame = invented(9)
    frame.loc[:9, "b"] = np.nan
    done = run_on(
        frame, "y", predictors=PREDICTORS, missing_data={"fill": {"b": "regression"}}, steps=["missing_data"]
    )
    seen = frame["b"].notna()
    exog = sm.add_constant(frame[["a", "c"]])
    filled = frame.copy()
    filled.loc[~seen, "b"] = sm.OLS(frame.loc[seen, "b"], exog[seen]).fit().predict(exog[~seen])
    assert terms(done)["b"].coefficient == pytest.approx(judge(filled, ["a", "b", "c"]).params["b"], rel=1e-8)


@pytest.mark.parametrize(("method", "criterion"), [("backward_aic", "aic"), ("backward_bic", "bic")])
def test_selection_by_a_criterion(method, criterion):
    """Predictors leave while the criterion falls; no single removal from the last model lowers it."""
    frame = invented(10)
    done = run_on(frame, "y", predictors=PREDICTORS, selection={"method": method}, steps=["selection"])
    kept = [term.term for term in done.lock.answer.terms if term.predictor]
    best = getattr(judge(frame, kept), criterion)
    assert getattr(done.lock.answer, criterion) == pytest.approx(best, rel=1e-9)
    for name in kept:
        fewer = [other for other in kept if other != name]
        assert getattr(judge(frame, fewer), criterion) > best


def test_best_subset_is_the_best_of_all():
    """The subset of significant predictors with the largest adjusted R², by trying every one."""
    import itertools

    frame = invented(11)
    done = run_on(frame, "y", predictors=PREDICTORS, selection={"method": "best_subset"}, steps=["selection"])
    fits = {}
    for size in (1, 2, 3):
        for names in itertools.combinations(["a", "b", "c"], size):
            fit = judge(frame, list(names))
            if (fit.pvalues[list(names)] <= 0.05).all():
                fits[names] = fit.rsquared_adj
    kept = tuple(term.term for term in done.lock.answer.terms if term.predictor)
    assert kept == max(fits, key=fits.get)


def test_adjusted_p_of_focal_predictors():
    """Holm's adjustment over the declared focal predictors (statsmodels' multipletests)."""
    from statsmodels.stats.multitest import multipletests

    frame = invented(12)
    focal = [{"column": name, "role": "focal"} for name in ("a", "b", "c")]
    done = run_on(frame, "y", predictors=focal, selection={"method": "none"}, steps=[], multiplicity="holm")
    found = multipletests([terms(done)[name].p for name in ("a", "b", "c")], method="holm")[1]
    assert [terms(done)[name].adjusted_p for name in ("a", "b", "c")] == pytest.approx(
        found.tolist(), rel=1e-8
    )


def test_near_misses_name_the_sample_they_need():
    """Theory and a weak model: the rows needed give the declared power by the noncentral F (scipy)."""
    frame = invented(13, n=30)
    frame["y"] = np.random.default_rng(13).normal(0, 1, 30) + 0.25 * frame["c"]
    keep = [{"predictor": "c", "rule": {"unless_p_above": 0.5}, "because": "It is in the theory."}]
    done = run_on(frame, "y", predictors=PREDICTORS, keep=keep, steps=["selection"])
    assert done.status in ("inconclusive", "mean_only", "adopted")
    for miss in done.lock.answer.near_misses:
        n, f2 = miss.rows_needed, miss.partial_f2
        limit = stats.f.isf(0.05, 1, n - 4)
        assert stats.ncf.sf(limit, 1, n - 4, f2 * n) >= 0.80 - 1e-9


def test_an_alternative_that_comes_out_otherwise_says_how():
    """The lock holds both answers, and the differences by the plan's tolerances."""
    frame = invented(14)
    done = run_on(
        frame, "y", predictors=PREDICTORS, steps=["selection"],
        alternatives={"lenient": {"alpha": 0.99}, "same": {"alpha": 0.049}},
    )  # fmt: skip
    lenient, same = done.lock.alternatives["lenient"], done.lock.alternatives["same"]
    assert not lenient.holds
    assert lenient.differences == ("c comes into the model.",)
    assert same.holds
    assert same.differences == ()


def test_too_few_rows_for_the_model():
    """Fewer rows than coefficients is a fault of the table, said before any fit."""
    frame = invented(15).head(4)
    with pytest.raises(DataError, match="row"):
        run_on(frame, "y", predictors=PREDICTORS, steps=["selection"])

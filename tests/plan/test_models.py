"""The defaults of the language, and what keeps a plan from being changed."""

from __future__ import annotations

import pickle
from collections.abc import Callable

import pytest
from pydantic import ValidationError

from beforehand.plan import (
    STEPS,
    ClusterBy,
    CurvatureCheck,
    FillValue,
    IndependenceCheck,
    KeepGroup,
    KeepPredictor,
    NormalityCheck,
    Plan,
    Predictor,
    SpreadCheck,
    UnlessP,
)
from beforehand.plan.written import FrozenMapping


def test_defaults(plan_with: Callable[..., Plan]) -> None:
    """What a plan leaves out is what the language says it is."""
    plan = plan_with()
    assert (plan.purpose, plan.alpha, plan.multiplicity, plan.intercept) == ("explain", 0.05, "none", True)
    assert (plan.eligibility, plan.derive, plan.products, plan.keep, plan.amendments) == ((), (), (), (), ())
    assert plan.steps == STEPS
    assert plan.errors == "classical"
    assert plan.expects is None
    assert dict(plan.alternatives) == {}
    data = plan.data
    assert (data.row_label, data.missing_codes, data.labels_in_lock) == (None, ("", "NA", "-"), "shown")
    assert (data.separator, data.decimal, data.encoding) == (",", ".", "utf-8")
    assert plan.outcome.transforms == ()
    missing = plan.missing_data
    assert (missing.remove_predictor_above, dict(missing.fill)) == (0.4, {})
    assert (missing.otherwise, missing.out_of_range) == ("remove_rows", "fault")
    checks = plan.assumptions
    assert checks.curvature == CurvatureCheck(alpha=0.01)
    assert checks.equal_spread == SpreadCheck(test="breusch_pagan", alpha=0.01)
    assert checks.normal_residuals == NormalityCheck(test="jarque_bera", alpha=0.01)
    assert checks.independence == IndependenceCheck(test="breusch_godfrey", lags=1, alpha=0.01)
    assert plan.transforms.when == ("curvature",)
    assert plan.transforms.try_ == ("square", "cube", "square_root")
    assert plan.transforms.if_none_works == "keep_as_is"
    pairs = plan.collinearity
    assert (pairs.examine_when.vif_above, pairs.examine_when.correlation_above) == (5.0, 0.8)
    assert (pairs.when_one_significant, pairs.when_both_significant) == ("remove_other", "compare")
    assert (pairs.large_change.r_squared, pairs.large_change.coefficient) == (0.02, 1.0)
    assert (pairs.if_large, pairs.if_small) == ("remove_weaker", "keep_both")
    flags = plan.influence.flag_when
    limits = (flags.cooks_distance, flags.leverage, flags.studentized_residual)
    assert [limit and limit.text for limit in limits] == ["4/n", "3*p/n", "3"]
    assert (flags.dffits, flags.dfbetas, flags.covariance_ratio) == (None, None, None)
    ground = plan.influence.remove_when
    assert (ground.coefficient, ground.r_squared) == (1.0, None)
    assert (ground.significance_changes, ground.sign_changes) == (False, False)
    assert (plan.influence.at_most, plan.influence.record_at_most) == (0.05, 50)
    assert plan.selection.method == "backward"
    weak = plan.weak_model
    assert (weak.with_theory, weak.without_theory, weak.near) == ("report", "mean_only", 0.2)
    final = plan.final_checks
    assert final.if_spread_unequal == "robust_errors"
    assert (final.if_not_normal, final.if_curved, final.if_dependent) == ("report", "report", "report")
    assert (plan.rehearsal.replicates, plan.rehearsal.seed) == (2000, 20261201)
    assert plan.rehearsal.scenarios == ("noise", "expected", "resample")
    refresh = plan.refresh
    assert (refresh.coefficient, refresh.r_squared) == (2.0, 0.05)
    assert (refresh.rulings, refresh.learned) == ("same", "anew")


def test_predictors(plan_with: Callable[..., Plan]) -> None:
    """A predictor is a candidate number unless it says otherwise; a baseline is the first level."""
    bloom, rain, breed = plan_with().predictors
    assert (bloom.role, bloom.kind, bloom.range) == ("focal", "number", (0.0, 120.0))
    assert (rain.role, rain.kind, rain.range, rain.baseline) == ("candidate", "number", None, None)
    assert (breed.levels, breed.baseline) == (("dark", "yellow", "mixed"), "dark")
    assert plan_with().predictor("rain") is not None
    with pytest.raises(KeyError):
        plan_with().predictor("moon")


def test_unions(large: Plan) -> None:
    """A rule, a fill, a check and errors are read as what their shape says."""
    first, second = large.keep
    assert isinstance(first, KeepPredictor)
    assert first.rule == UnlessP(unless_p_above=0.2)
    assert isinstance(second, KeepGroup)
    assert second.at_least_one_of == ("rain", "warm")
    assert large.errors == ClusterBy(cluster_by="apiary")
    assert dict(large.missing_data.fill) == {
        "breed": "most_common", "rain": "median", "warm": FillValue(value=3.0),
    }  # fmt: skip
    assert large.derive[0].from_ == "(day_temp - night_temp) / 2"


def test_skipped_checks(plan_with: Callable[..., Plan]) -> None:
    """Each check may be skipped by the word."""
    names = ("curvature", "equal_spread", "normal_residuals", "independence")
    checks = plan_with(assumptions=dict.fromkeys(names, "skip")).assumptions
    assert [getattr(checks, name) for name in names] == ["skip"] * 4


def test_products_are_kept_by_pair(plan_with: Callable[..., Plan]) -> None:
    """A rule may keep a product."""
    keep = [{"predictor": ["bloom", "rain"], "rule": "always", "because": "b", "expected_sign": "negative"}]
    (rule,) = plan_with(products=[["bloom", "rain"]], keep=keep).keep
    assert isinstance(rule, KeepPredictor)
    assert rule.predictor == ("bloom", "rain")


def test_frozen(large: Plan) -> None:
    """Nothing in a plan can be set."""
    with pytest.raises(ValidationError):
        large.alpha = 0.01  # type: ignore[misc]  # the point of the test
    with pytest.raises(TypeError):
        large.missing_data.fill["rain"] = "mean"  # type: ignore[index]  # the point of the test
    with pytest.raises(TypeError):
        large.alternatives["stricter"]["alpha"] = 1  # type: ignore[index]  # the point of the test


def test_models_can_be_made_directly() -> None:
    """A block made in Python is as strict as one that was read."""
    assert Predictor(column="a").kind == "number"
    with pytest.raises(ValidationError):
        CurvatureCheck(alpha=2.0)
    with pytest.raises(ValidationError):
        Predictor(column="a", colour="red")  # type: ignore[call-arg]  # the point of the test


def test_pickle(large: Plan) -> None:
    """A plan travels between processes with its origin."""
    again = pickle.loads(pickle.dumps(large))
    assert again == large
    assert again.origin == large.origin


def test_frozen_mapping() -> None:
    """A frozen mapping is sorted, copied, frozen through, equal to a dict and hashable."""
    source = {"b": {"y": [1], "x": 2}, "a": 1}
    frozen = FrozenMapping(source)
    source["c"] = 3
    assert list(frozen) == ["a", "b"]
    assert frozen == {"a": 1, "b": {"x": 2, "y": (1,)}}
    assert list(frozen["b"]) == ["x", "y"]  # type: ignore[call-overload]  # values are of several kinds here
    assert hash(frozen) == hash(FrozenMapping({"a": 1, "b": {"x": 2, "y": (1,)}}))
    assert repr(frozen) == "{'a': 1, 'b': {'x': 2, 'y': (1,)}}"

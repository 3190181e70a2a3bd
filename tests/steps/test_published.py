"""Whole runs on published tables: the rulings must be those of the source."""

from __future__ import annotations

import pytest
from tests_cases import ANSCOMBE, CEMENT, DELIVERY, LONGLEY, STACK_LOSS, rulings, run_on, terms

BACKWARD = ["selection"]


@pytest.mark.parametrize("alpha", [0.15, 0.10, 0.05, 0.01])
def test_cement_backward_elimination_drops_x3_then_x4(alpha):
    """Draper & Smith: backward elimination drops x3 (F 0.018), then x4 (F 1.86), and stops at x1, x2."""
    done = run_on(CEMENT, "y", alpha=alpha, steps=BACKWARD)
    left = [r for r in done.lock.rulings if r.ground == "leaves_backward"]
    assert [r.subject for r in left] == ["x3", "x4"]
    assert left[0].evidence["p"] == pytest.approx(0.8959227, abs=5e-8)
    assert left[1].evidence["p"] == pytest.approx(0.2053954, abs=5e-8)
    found = terms(done)
    assert list(found) == ["intercept", "x1", "x2"]
    assert [t.coefficient for t in found.values()] == pytest.approx(
        [52.57734888, 1.468305742, 0.6622504913], rel=1e-9
    )
    assert [t.standard_error for t in found.values()] == pytest.approx(
        [2.28617433, 0.121300924, 0.0458547215], rel=1e-8
    )
    assert done.lock.answer.r_squared == pytest.approx(0.9786783745, rel=1e-9)
    assert done.lock.answer.press == pytest.approx(93.88255, abs=5e-6)
    assert done.status == "adopted"


@pytest.mark.parametrize(
    ("kept", "expected", "p_of_last"),
    [
        (["x4"], ["intercept", "x1", "x2", "x4"], ("x4", 0.205395)),
        (["x3"], ["intercept", "x1", "x2", "x3"], ("x3", 0.208889)),
        (["x3", "x4"], ["intercept", "x1", "x3", "x4"], ("x3", 0.0696923)),
    ],
)
def test_cement_with_keep_rules(kept, expected, p_of_last):
    """A kept predictor never leaves, whatever its p (values recomputed with scipy and statsmodels)."""
    rules = [{"predictor": name, "rule": "always", "because": "It is in the theory."} for name in kept]
    done = run_on(CEMENT, "y", alpha=0.10, steps=BACKWARD, keep=rules)
    found = terms(done)
    assert list(found) == expected
    assert found[p_of_last[0]].p == pytest.approx(p_of_last[1], rel=1e-5)


def test_longley_backward_elimination():
    """Longley at 0.10 drops GNPDEFL (p .863141), then POP (p .641607)."""
    done = run_on(LONGLEY, "TOTEMP", alpha=0.10, steps=BACKWARD)
    left = [r for r in done.lock.rulings if r.ground == "leaves_backward"]
    assert [r.subject for r in left] == ["GNPDEFL", "POP"]
    assert [r.evidence["p"] for r in left] == pytest.approx([0.863141, 0.641607], abs=5e-7)
    assert [t.coefficient for t in terms(done).values()] == pytest.approx(
        [-3598729.374, -0.04019046967, -2.088390732, -1.014638896, 1887.40951], rel=1e-9
    )


def test_longley_variance_inflation():
    """Longley's VIFs: 135.5, 1788.5, 33.6, 3.59, 399.2, 759.0 (more digits by 60-digit arithmetic)."""
    done = run_on(LONGLEY, "TOTEMP", steps=["collinearity"])
    found = {i.predictor: i.vif for i in done.lock.checks.inflation if i.stage == "collinearity"}
    assert list(found.values()) == pytest.approx(
        [135.53243828, 1788.5134827182, 33.61889059605, 3.5889301934455, 399.15102231264, 758.98059740689],
        rel=5e-10,  # the lock has ten digits
    )


def test_longley_condition_indices():
    """Belsley, Kuh & Welsch: condition indices 1, 9.14, 12.26, 25.34, 230.4, 1048, 43275."""
    done = run_on(LONGLEY, "TOTEMP", steps=["collinearity"])
    indices = [c.index for c in done.lock.checks.condition]
    assert indices == pytest.approx(
        [1, 9.14172052, 12.25573505, 25.3366071, 230.423946, 1048.080298, 43275.04359], rel=1e-9
    )
    shares = list(done.lock.checks.condition[-1].shares.values())
    assert shares == pytest.approx([0.9999, 0.0383, 0.6546, 0.6893, 0.3020, 0.1597, 0.9998], abs=5e-5)


def anscombe(number, **blocks):
    """One of Anscombe's four tables under the default steps up to selection."""
    x, y = ANSCOMBE[number]
    return run_on(
        {"x": x, "y": y},
        "y",
        steps=["missing_data", "transforms", "collinearity", "influence", "selection"],
        **blocks,
    )


def test_anscombe_one_is_adopted_as_it_is():
    """Table 1: y = 3.00 + 0.500 x, R² .667; nothing is changed or removed."""
    done = anscombe(1)
    assert done.status == "adopted"
    assert done.lock.rows_removed == ()
    assert done.lock.predictors["x"].transform is None
    assert [t.coefficient for t in terms(done).values()] == pytest.approx([3.00009091, 0.500090909], rel=1e-8)


def test_anscombe_two_fails_curvature():
    """Table 2 bends: the added square has t -2219, and the predictor goes to the ladder."""
    done = anscombe(2)
    assert ("x", "bent") in rulings(done, "transforms")
    first = next(c for c in done.lock.checks.assumptions if c.check == "curvature")
    assert first.statistic == pytest.approx(-2219.238, rel=1e-6)


def test_anscombe_three_loses_one_row():
    """Table 3: the row at x = 13 leaves; without it y = 4.00565 + 0.345390 x."""
    done = anscombe(3)
    assert len(done.lock.rows_removed) == 1
    ruling = next(r for r in done.lock.rulings if r.step == "influence" and r.ground.startswith("row_leaves"))
    assert ruling.evidence["studentized_residual"] == pytest.approx(1203.5395, rel=1e-6)
    assert ruling.evidence["cooks_distance"] == pytest.approx(1.392849, rel=1e-6)
    assert [t.coefficient for t in terms(done).values()] == pytest.approx([4.00564935, 0.34538961], rel=1e-8)
    assert done.lock.answer.residual_sd == pytest.approx(0.00308168, rel=1e-5)


def test_anscombe_four_has_no_slope_without_one_row():
    """Table 4: one row alone makes the slope; it leaves, x is constant, and the mean is the answer."""
    done = anscombe(4)
    verdicts = [verdict for _, verdict in rulings(done, "influence")]
    assert verdicts[:2] == ["row_leaves_sole", "leaves_constant"]
    assert done.status == "mean_only"
    assert done.lock.predictors["x"].verdict == "removed"


def test_stack_loss_row_21():
    """Brownlee's row 21: Cook's distance .692, external t -3.33 (Cook 1977; Daniel & Wood)."""
    table = {"row": [f"r{i:02d}" for i in range(1, 22)], **STACK_LOSS}
    done = run_on(
        table,
        "y",
        data={"row_label": "row"},
        predictors=[{"column": c} for c in ("x1", "x2", "x3")],
        steps=["influence"],
        influence={"at_most": "0%", "remove_when": {"coefficient": 100.0}},
    )
    row = next(r for r in done.lock.checks.influence if r.row == "r21")
    assert row.stays
    assert row.cooks_distance == pytest.approx(0.6920, abs=5e-5)
    assert row.studentized_residual == pytest.approx(-3.3305, abs=5e-5)
    assert row.leverage == pytest.approx(0.2845, abs=5e-5)
    assert row.dffits == pytest.approx(-2.1003, abs=5e-5)


def test_stack_loss_without_row_21():
    """Without row 21 the coefficients are -43.70, .889, .817, -.107."""
    table = {"row": [f"r{i:02d}" for i in range(1, 22)], **STACK_LOSS}
    done = run_on(
        table,
        "y",
        data={"row_label": "row"},
        predictors=[{"column": c} for c in ("x1", "x2", "x3")],
        steps=["influence"],
        influence={"remove_when": {"coefficient": 1.0}, "at_most": "1%"},
    )
    assert [r.row for r in done.lock.rows_removed] == ["r21"]
    assert [t.coefficient for t in terms(done).values()] == pytest.approx(
        [-43.70403096, 0.889108181, 0.8166198714, -0.1071413686], rel=1e-9
    )


def test_delivery_without_row_9():
    """Without row 9 the delivery times give 4.447, 1.498, .0103 and MSE 5.905."""
    done = run_on(DELIVERY, "minutes", steps=["influence"], influence={"at_most": "1%"})
    assert len(done.lock.rows_removed) == 1
    assert [t.coefficient for t in terms(done).values()] == pytest.approx(
        [4.44723773, 1.49769128, 0.0103240587], rel=1e-8
    )
    assert done.lock.answer.residual_sd**2 == pytest.approx(5.9048761, rel=1e-8)

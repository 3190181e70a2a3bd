"""A small lock about invented cold rooms, whole enough to be told, compared and changed."""

from __future__ import annotations

from typing import Any

import pytest

from beforehand.lock import (
    Alternative,
    Answer,
    AnswerOutcome,
    AnswerPredictor,
    AnswerTerm,
    AssumptionCheck,
    Checks,
    Correlation,
    DataRecord,
    Environment,
    FitOutcome,
    FitRecord,
    FitRows,
    FitTerm,
    FitTest,
    InfluenceRow,
    JointComparison,
    LedgerStage,
    Lock,
    PlanRecord,
    PredictorFate,
    RowRemoved,
    RulingRecord,
    SealRecord,
)
from beforehand.wording import verdict_of

DIGEST = "sha256:" + "0123456789abcdef" * 4

WRITTEN = {
    "language": 1,
    "title": "Cold rooms",
    "outcome": {"column": "kwh", "unit": "kWh per day"},
    "predictors": [{"column": name} for name in ("outdoor_temp", "load", "pallets", "r0147")],
    "products": [["outdoor_temp", "load"]],
    "keep": [{"at_least_one_of": ["load", "pallets"], "because": "Product mass must be represented."}],
    "alpha": 0.05,
    "influence": {"flag_when": {"cooks_distance": "4/n", "leverage": "3*p/n", "studentized_residual": 3.0}},
    "steps": [],
}


def fit(number: str, step: str, rows: int, **coefficients: float) -> FitRecord:
    """Make a fit with the intercept and these coefficients, each with standard error 0.5."""
    terms = [("intercept", None, 38.2), *((name, name, value) for name, value in coefficients.items())]
    return FitRecord(
        id=number,
        step=step,
        why="working model",
        rows=FitRows(n=rows, digest=DIGEST),
        outcome=FitOutcome(column="kwh", transform="identity", exponent=None),
        errors="classical",
        terms=tuple(
            FitTerm(
                term=term,
                predictor=predictor,
                transform=None,
                exponent=None,
                level=None,
                coefficient=value,
                standard_error=0.5,
                t=value / 0.5,
                p=0.01,
            )
            for term, predictor, value in terms
        ),
        tests=tuple(
            FitTest(predictor=name, df=1, statistic=value / 0.5, p=0.01)
            for name, value in coefficients.items()
        ),
        r_squared=0.81,
        adjusted_r_squared=0.8,
        residual_sd=40.25,
        f=100.5,
        f_df=(len(coefficients), rows - len(coefficients) - 1),
        f_p=1e-30,
        aic=4000.125,
        bic=4010.5,
        exact=False,
    )


def ruling(number: str, step: str, clause: str, subject: str, ground: str, **given: Any) -> RulingRecord:
    """Make a ruling; what is not given is empty."""
    fields: dict[str, Any] = {
        "fits": (),
        "checks": (),
        "evidence": {},
        "limit": None,
        "margin": None,
        "knife_edge": False,
        "because": None,
        "says": f"{subject}: {ground}.",
    }
    return RulingRecord(
        id=number,
        step=step,
        clause=clause,
        subject=subject,
        verdict=verdict_of(ground),
        ground=ground,
        **{**fields, **given},
    )


def checks(**given: Any) -> Checks:
    """Make checks; what is not given is empty."""
    empty: dict[str, Any] = dict.fromkeys(Checks.model_fields, ()) | {"jointly_without_flagged": None}
    return Checks(**{**empty, **given})


def answer() -> Answer:
    """Make an answer with one predictor."""
    return Answer(
        fit="F004",
        outcome=AnswerOutcome(
            column="kwh", unit="kWh per day", transform="identity", exponent=None, smearing=None
        ),
        equation="kwh = 38.2 + 6.41 outdoor_temp",
        errors="classical",
        terms=(
            AnswerTerm(
                term="outdoor_temp",
                predictor="outdoor_temp",
                transform=None,
                exponent=None,
                level=None,
                unit="°C",
                coefficient=6.41,
                standard_error=0.5,
                t=12.82,
                p=1.25e-20,
                low=5.43,
                high=7.39,
                standardized=0.75,
                adjusted_p=None,
            ),
        ),
        predictors=(
            AnswerPredictor(
                predictor="outdoor_temp",
                df=1,
                statistic=12.82,
                p=1.25e-20,
                semipartial_r_squared=0.5,
                adjusted_p=None,
                alone=None,
            ),
        ),
        rows=396,
        r_squared=0.81,
        adjusted_r_squared=0.8,
        predicted_r_squared=0.79,
        press=1e22,
        residual_sd=40.25,
        f=100.5,
        f_df=(1, 394),
        f_p=1e-30,
        aic=4000.125,
        bic=4010.5,
        share_explained=0.81,
        share_unexplained=0.19,
        mean=None,
        near_misses=(),
        sign_contradictions=(),
        full_model="F001",
        knife_edges=(),
        fragility=None,
        cautions=("Association is not causation.",),
    )


@pytest.fixture
def lock() -> Lock:
    """Give the whole small lock."""
    rulings = (
        ruling("R001", "missing_data", "missing_data.remove_predictor_above", "pallets", "full_enough"),
        ruling(
            "R002",
            "collinearity",
            "collinearity.when_one_significant",
            "pallets",
            "weaker_leaves",
            fits=("F001", "F002"),
            evidence={"partner": "load", "correlation": 0.91, "p": 0.412},
            limit=0.05,
            margin=0.362,
        ),
        ruling("R003", "collinearity", "keep[0]", "load", "kept_last_of_group", because="Product mass."),
        ruling(
            "R004",
            "influence",
            "influence.remove_when.coefficient",
            "r0147",
            "row_leaves_coefficient",
            fits=("F002", "F003"),
            evidence={"cooks_distance": 0.5},
            limit=1.0,
            margin=0.25,
        ),
        ruling(
            "R005", "influence", "influence.remove_when", "flagged rows", "flagged_rows_stay", fits=("F003",)
        ),
        ruling("R006", "selection", "selection.method", "load", "leaves_backward", fits=("F003",)),
        ruling("R007", "selection", "alpha", "outdoor_temp", "stays", fits=("F004",), checks=("C001",)),
    )
    row: dict[str, Any] = {
        "leverage": 0.02,
        "studentized_residual": -3.5,
        "cooks_distance": 0.5,
        "dffits": None,
        "change_r_squared": 0.01,
        "change_coefficient": 1.25,
        "of": "load",
        "significance_changes": (),
        "sign_changes": (),
    }
    looked_at = checks(
        correlations=(Correlation(stage="collinearity", first="load", second="pallets", r=0.91),),
        assumptions=(
            AssumptionCheck(
                id="C001",
                stage="final_checks",
                check="jarque_bera",
                subject=None,
                fit="F004",
                statistic=2.5,
                df=(2,),
                p=0.28,
                alpha=0.01,
                verdict="passed",
                because=None,
            ),
        ),
        influence=(
            InfluenceRow(row="r0147", ruling="R004", stays=False, **row),
            InfluenceRow(row="r0200", ruling="R005", stays=True, **{**row, "studentized_residual": -2.5}),
        ),
        jointly_without_flagged=JointComparison(
            rows=1, fit="F003", change_r_squared=0.001, change_coefficient=0.25, of="load"
        ),
    )
    fates = {
        "outdoor_temp": ("adopted", "R007"),
        "load": ("removed", "R006"),
        "pallets": ("removed", "R002"),
        "r0147": ("in_model", None),
        "outdoor_temp × load": ("removed", "R006"),
    }
    body: dict[str, Any] = {
        "status": "adopted",
        "answer": answer(),
        "ledger": (LedgerStage(stage="read", rows=412, because=None),),
        "rows_removed": (RowRemoved(row="r0147", step="influence", ruling="R004"),),
        "predictors": {
            name: PredictorFate(
                verdict=verdict, ruling=number, transform=None, exponent=None, says=f"{name}: {verdict}."
            )
            for name, (verdict, number) in fates.items()
        },
        "rulings": rulings,
        "fits": (
            fit("F001", "transforms", 397, outdoor_temp=6.4, load=1.2, pallets=0.1),
            fit("F002", "collinearity", 397, outdoor_temp=6.5, load=1.3),
            fit("F003", "influence", 396, outdoor_temp=6.45, load=0.7),
            fit("F004", "selection", 396, outdoor_temp=6.41),
        ),
        "checks": looked_at,
    }
    return Lock(
        lock=1,
        plan=PlanRecord(
            file="cold-rooms.plan.yaml",
            title="Cold rooms",
            question="Which conditions go with electricity use, and by how much?",
            decisions=DIGEST,
            whole=DIGEST,
            written=WRITTEN,
        ),
        seal=SealRecord(state="unsealed", changes=()),
        data=DataRecord(file="cold-rooms.csv", fingerprint=DIGEST, rows=412, labelled=True, labels="shown"),
        **body,
        alternatives={
            "stricter": Alternative(
                changes={"alpha": 0.01},
                holds=False,
                differences=("load is no longer in the model.",),
                **{**body, "rows_removed": (), "status": "inconclusive"},
            )
        },
        environment=Environment(
            beforehand="0.1.0",
            python="3.11.9",
            numpy="2.4.0",
            scipy="1.17.0",
            pandas="3.1.1",
            statsmodels="0.15.0",
        ),
    )

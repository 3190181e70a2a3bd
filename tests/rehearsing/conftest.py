"""Replicates made by hand of an invented plan: heat of a greenhouse by sun, wind, shade and kind of glass."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from beforehand.lock import Environment
from beforehand.rehearsing.models import (
    RehearsalRecord,
    RehearsedData,
    RehearsedPlan,
    Scenarios,
    ScrambledRun,
)
from beforehand.rehearsing.observed import HeldOut, Observed, SeenRuling
from beforehand.rehearsing.summaries import (
    expected_figures,
    hold_out_figures,
    noise_figures,
    resample_figures,
)
from beforehand.rehearsing.text import with_digest
from beforehand.rehearsing.trials import STATUSES, Subjects, Trials, empty

DIGEST = "sha256:" + "7" * 64
ALPHA = 0.05

MakeTrials = Callable[..., Trials]


@pytest.fixture
def subjects() -> Subjects:
    """Three numbers, one of them always kept, and a category of three levels."""
    return Subjects(
        names=("sun", "wind", "shade", "glass"),
        held=(False, False, True, False),
        columns=("sun", "wind", "shade", "glass[thick]", "glass[old]"),
        owners=(0, 1, 2, 3, 3),
    )


@pytest.fixture
def made(subjects: Subjects) -> MakeTrials:
    """Replicates without a fit, but for the arrays that are given."""

    def make(count: int, **given: Any) -> Trials:
        blank = empty(count, subjects, given.pop("rulings", 0))
        if "adopted" in given:
            # What was adopted stands in the model.
            given.setdefault("present", given["adopted"])
        if "r_squared" in given:
            given.setdefault("here", given["r_squared"])
        arrays = {
            name: np.asarray(value).astype(getattr(blank, name).dtype, copy=True)
            for name, value in given.items()
        }
        return replace(blank, **arrays)

    return make


@pytest.fixture
def drawn(made: MakeTrials) -> MakeTrials:
    """Replicates of a plan that finds sun nearly always and wind sometimes, from a seed."""

    def make(count: int, seed: int = 1, rulings: int = 0) -> Trials:
        random = np.random.default_rng(seed)
        adopted = random.random((count, 4)) < (0.97, 0.2, 1.0, 0.1)
        estimates = random.normal((6.4, 0.3, 1.1, 2.0, -1.0), (0.6, 0.2, 0.4, 1.0, 1.0), (count, 5))
        estimates[~adopted[:, [0, 1, 2, 3, 3]]] = np.nan
        r_squared = random.beta(30, 10, count)
        stopped = random.random(count) < 0.01
        adopted[stopped] = False
        estimates[stopped] = np.nan
        r_squared[stopped] = np.nan
        return made(
            count,
            rulings=rulings,
            status=np.where(stopped, STATUSES.index("stopped"), STATUSES.index("adopted")),
            adopted=adopted,
            significant=adopted & (random.random((count, 4)) < 0.9),
            estimates=estimates,
            errors=np.where(np.isfinite(estimates), 0.5, np.nan),
            df=np.where(stopped, np.nan, 90.0),
            r_squared=r_squared,
            adjusted_r_squared=r_squared - 0.01,
            model_p=np.where(stopped, np.nan, random.random(count)),
            full_p=np.where(stopped, np.nan, random.random(count)),
            rows=np.where(stopped, 0, 100),
            elsewhere=r_squared - random.normal(0.03, 0.01, count),
            slope=np.where(stopped, np.nan, random.normal(0.95, 0.05, count)),
            same_rulings=random.random((count, rulings)) < 0.7,
        )

    return make


@pytest.fixture
def observed() -> Observed:
    """The real run: sun and shade, two rulings."""
    nan = np.nan
    return Observed(
        lock=DIGEST,
        status="adopted",
        adopted=np.array([True, False, True, False]),
        transformed=np.zeros(4, dtype=bool),
        estimates=np.array([6.4, nan, 1.1, nan, nan]),
        errors=np.array([0.6, nan, 0.4, nan, nan]),
        full_estimates=np.array([6.3, 0.1, 1.0, 0.5, nan]),
        full_errors=np.array([0.6, 0.2, 0.4, 0.9, nan]),
        r_squared=0.76,
        adjusted_r_squared=0.75,
        apparent=0.76,
        model_p=1e-9,
        rulings=(
            SeenRuling(id="R004", step="selection", subject="wind", ground="p"),
            SeenRuling(id="R005", step="selection", subject="glass", ground="p"),
        ),
    )


@pytest.fixture
def held_out() -> HeldOut:
    """Two repeats of three folds, one fold of which left no rows to run on."""
    return HeldOut(
        folds=3,
        groups=(),
        squared=np.array([[40.0, 38.0, 42.0], [41.0, np.nan, 39.0]]),
        squared_mean_model=np.array([[160.0, 158.0, 162.0], [161.0, np.nan, 159.0]]),
        rows=np.array([[10, 10, 9], [10, 0, 10]]),
        not_predicted=np.array([[0, 0, 1], [0, 0, 0]]),
        no_fit=np.array([[False, False, False], [False, True, False]]),
    )


@pytest.fixture
def record(drawn: MakeTrials, subjects: Subjects, observed: Observed, held_out: HeldOut) -> RehearsalRecord:
    """A whole record with every scenario, as it reads back from its file."""
    truth = {"sun": 6.0, "glass[thick]": 2.0}
    return with_digest(
        RehearsalRecord(
            rehearsal=1,
            plan=RehearsedPlan(file="greenhouse.plan.yaml", decisions=DIGEST, whole=DIGEST),
            data=RehearsedData(file="greenhouse.csv", fingerprint=DIGEST, rows=104),
            lock=DIGEST,
            seed=20261201,
            replicates=400,
            scenarios=Scenarios(
                scrambled=ScrambledRun(
                    lock="greenhouse.scrambled.lock.yaml", status="mean_only", seed=20261201
                ),
                noise=noise_figures(drawn(400), subjects, ALPHA, observed),
                expected=expected_figures(
                    [(100, drawn(400, 2)), (200, drawn(400, 3))], subjects, truth, ALPHA
                ),
                resample=resample_figures(drawn(400, 4), drawn(400, 5, 2), subjects, observed, ALPHA),
                hold_out=hold_out_figures(held_out),
            ),
            not_rehearsed=(),
            environment=Environment(
                beforehand="0.1.0",
                python="3.11.9",
                numpy="2.4.0",
                scipy="1.17.0",
                pandas="3.1.1",
                statsmodels="0.15.0",
            ),
        )
    )

"""A share-safe copy: the arithmetic that finds a row in a lock finds none in it."""

from __future__ import annotations

import itertools
import json
import math
import random
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

import beforehand
from beforehand.faults import LockError
from beforehand.handing import safe_text, share_safe
from beforehand.handing.safe import pooled

Record = Mapping[str, Any]
Row = tuple[float, float]

# The row that is to be found: outdoors much warmer than the rest, and far off the line.
HIDDEN = (39.25, 148.5)


def simple_run(n: int = 40, hidden: Row = HIDDEN, seed: int = 4) -> beforehand.Lock:
    """A simple regression of invented numbers in which one row is removed for its influence."""
    import pandas as pd

    draw = random.Random(seed)
    x = [round(draw.uniform(5, 20), 2) for _ in range(n)]
    y = [round(20 + 2.5 * one + draw.gauss(0, 2), 2) for one in x]
    x[7], y[7] = hidden
    plan = beforehand.plan_from_mapping(
        {
            "language": 1, "title": "Invented", "question": "Can a row be found?",
            "data": {"file": "t.csv", "row_label": "row"}, "outcome": {"column": "y"},
            "predictors": [{"column": "x"}], "transforms": {"try": []},
        }
    )  # fmt: skip
    frame = pd.DataFrame({"row": [f"r{place:02d}" for place in range(n)], "x": x, "y": y})
    lock = beforehand.run(plan, frame).lock
    assert [row.row for row in lock.rows_removed] == ["r07"]
    return lock


def sums_of_fits(record: Record) -> Iterator[tuple[int, float, float, float]]:
    """Rows, Σx, Σx² and Σy of each fit of y on x, from its coefficients and standard errors alone."""
    bodies = [record, *record["alternatives"].values()]
    for fit in [fit for body in bodies for fit in body.get("fits", ())]:
        terms = {term["term"]: term for term in fit["terms"]}
        if set(terms) != {"intercept", "x"} or not fit.get("residual_sd"):
            continue
        n, s2 = fit["rows"]["n"], fit["residual_sd"] ** 2
        centred = s2 / terms["x"]["standard_error"] ** 2
        size = math.sqrt(max(0.0, (terms["intercept"]["standard_error"] ** 2 / s2 - 1 / n) * centred))
        # The sign of the mean is not told; all of x is positive here, as an attacker would know.
        total = n * (terms["intercept"]["coefficient"] + terms["x"]["coefficient"] * size)
        yield n, n * size, centred + n * size**2, total


def sums_of_columns(record: Record) -> Iterator[tuple[int, float, float, float]]:
    """The same sums from the descriptions of both columns."""
    told = {one["column"]: one for one in record["checks"]["descriptives"]}
    x, y = told["x"], told["y"]
    if None in (x.get("mean"), x.get("sd"), y.get("mean")) or x["n"] != y["n"]:
        return
    n = x["n"]
    yield n, n * x["mean"], (n - 1) * x["sd"] ** 2 + n * x["mean"] ** 2, n * y["mean"]


def found_rows(record: Record) -> list[Row]:
    """Every row that the difference of two releases of the same sums gives."""
    known = [*sums_of_fits(record), *sums_of_columns(record)]
    return [
        (with_it[1] - without[1], with_it[3] - without[3])
        for with_it, without in itertools.permutations(known, 2)
        if with_it[0] - without[0] == 1
    ]


def finds(record: Record, row: Row, within: float) -> bool:
    """Whether the attack finds a row, relative to its size."""
    return any(
        abs(x - row[0]) <= within * abs(row[0]) and abs(y - row[1]) <= within * abs(row[1])
        for x, y in found_rows(record)
    )


def opened(lock: beforehand.Lock) -> Record:
    """A lock as plain data."""
    data: Record = yaml.safe_load(beforehand.lock_text(lock))
    return data


def test_differencing_finds_the_removed_row_in_an_open_lock_and_not_in_the_safe_copy() -> None:
    """From two fits, with and without the row, its two values come out to five digits."""
    lock = simple_run()
    assert finds(opened(lock), HIDDEN, within=1e-5)
    safe = yaml.safe_load(safe_text(lock))
    assert found_rows(safe) == []
    assert len({fit["rows"]["n"] for fit in safe["fits"]}) == 1
    assert safe["answer"]["terms"][1]["coefficient"] == lock.answer.terms[1].coefficient  # type: ignore[union-attr]


def test_descriptions_of_columns_are_as_good_as_a_fit_for_the_attack() -> None:
    """Mean and spread over all rows, against the one fit that is left, find the row in the open lock."""
    record = opened(simple_run())
    final = next(fit for fit in record["fits"] if fit["id"] == record["answer"]["fit"])
    assert finds({**record, "fits": [final], "alternatives": {}}, HIDDEN, within=1e-5)


def test_rounding_the_first_fit_would_not_have_been_enough() -> None:
    """Why fits on other rows are left out whole: at three digits the row is still told to a tenth."""
    record = opened(simple_run())
    final = next(fit for fit in record["fits"] if fit["id"] == record["answer"]["fit"])
    first = json.loads(json.dumps(record["fits"][0]), parse_float=lambda text: float(f"{float(text):.3g}"))
    rounded = {**record, "fits": [first, final], "alternatives": {}, "checks": {"descriptives": [
        {"column": "x", "n": 0}, {"column": "y", "n": 1}]}}  # fmt: skip
    assert finds(rounded, HIDDEN, within=0.15)


@pytest.mark.parametrize("seed", range(6))
def test_no_value_of_the_removed_row_is_in_the_copy(seed: int) -> None:
    """Nor its label, nor a smallest or largest value, nor a digest with which a guess could be tried."""
    hidden = (36.125 + seed / 16, 160.375 + seed)
    lock = simple_run(hidden=hidden, seed=seed)
    text = safe_text(lock)
    for secret in (str(hidden[0]), str(hidden[1]), "r07", lock.data.fingerprint, lock.fits[0].rows.digest):
        assert secret in beforehand.lock_text(lock)
        assert secret not in text
    for word in ("minimum", "maximum", "median", "quartile", "cooks", "leverage:", "studentized_residual:"):
        assert word not in text.split("\nanswer:")[1]


def test_a_copy_says_what_it_is_and_cannot_pass_for_the_lock(tmp_path: Path) -> None:
    """Its head, the digest of the original, and that no reader of locks takes it."""
    lock = simple_run()
    (tmp_path / "t.safe.yaml").write_text(safe_text(lock), encoding="utf-8")
    record = yaml.safe_load(safe_text(lock))
    assert list(record)[:3] == ["share_safe", "original", "left_out"]
    assert (record["share_safe"], record["original"]) == ({"fewest": 5}, lock.digest)
    assert record["left_out"]["fits"] == len(lock.fits) - len(record["fits"])
    assert "lock" not in record
    assert "digest" not in record
    with pytest.raises(LockError, match="it is no lockfile"):
        beforehand.read_lock(tmp_path / "t.safe.yaml")
    assert safe_text(lock) == safe_text(lock)


def test_where_no_row_left_everything_but_single_values_stays(racks: Any, tmp_path: Path) -> None:
    """All fits are on one set of rows then, and correlations and checks stand."""
    table = "".join(line for line in racks.table_text().splitlines(True) if not line.startswith("k041"))
    plan = racks.made_in(tmp_path / "a", table=table)
    lock = beforehand.read_lock(plan.parent / "racks.lock.yaml")
    assert lock.rows_removed == ()
    safe = share_safe(lock)
    same = {fit.id for fit in lock.fits if fit.rows.n == 59}
    assert {fit["id"] for fit in safe["fits"]} == same
    assert len(safe["checks"]["correlations"]) == len(lock.checks.correlations)
    assert safe["answer"]["equation"] == lock.answer.equation  # type: ignore[union-attr]
    assert safe["checks"]["descriptives"][0]["mean"] == lock.checks.descriptives[0].mean
    assert set(safe["alternatives"]["robust"]) >= {"answer", "fits"}


def category_run(levels: list[str], y: list[float], x: list[float]) -> beforehand.Lock:
    """A regression of invented numbers on levels and a number."""
    import pandas as pd

    plan = beforehand.plan_from_mapping(
        {
            "language": 1, "title": "Invented", "question": "Can a row be found?",
            "data": {"file": "t.csv"}, "outcome": {"column": "y"},
            "predictors": [{"column": "kind", "kind": "category", "levels": sorted(set(levels))},
                           {"column": "x"}],
            "influence": {"at_most": 0.0},
        }
    )  # fmt: skip
    return beforehand.run(plan, pd.DataFrame({"kind": levels, "x": x, "y": y})).lock


def test_the_coefficient_of_a_level_with_one_row_is_that_row() -> None:
    """From the fit of the levels alone in the open lock; the safe copy has neither it nor a way to it."""
    draw = random.Random(11)
    levels = ["one"] + ["a"] * 30 + ["b"] * 29
    x = [round(draw.uniform(0, 9), 2) for _ in levels]
    y = [round(10 + 2 * one + 8 * (kind == "b") + 90 * (kind == "one") + draw.gauss(0, 1), 2)
         for one, kind in zip(x, levels, strict=True)]  # fmt: skip
    lock = category_run(levels, y, x)
    alone = next(fit for fit in lock.fits if {t.predictor for t in fit.terms} == {None, "kind"})
    base, *others = alone.terms
    one = next(term for term in others if term.level == "one")
    assert math.isclose(base.coefficient + one.coefficient, y[0], rel_tol=1e-9)
    safe = share_safe(lock)
    assert all({"kind"} <= {term["predictor"] for term in fit["terms"]} for fit in safe["fits"])
    held = [term for term in safe["answer"]["terms"] if term["predictor"] in (None, "kind")]
    assert len(held) == 3
    assert all(term[key] is None for term in held for key in ("coefficient", "standard_error", "t", "p"))
    slope = next(term for term in safe["answer"]["terms"] if term["predictor"] == "x")
    assert slope["coefficient"] is not None
    for key in ("r_squared", "f", "equation", "press"):
        assert safe["answer"][key] is None
    told = {one["column"]: one for one in safe["checks"]["descriptives"]}
    assert "mean" not in told["x"]
    assert told["kind"]["levels"] == {"a": 30}
    assert told["kind"]["pooled"]["levels"] == ["b", "one"]
    assert str(y[0]) not in safe_text(lock)


def test_an_outcome_or_an_answer_of_a_few_rows_is_refused() -> None:
    """Where the answer itself is a few rows, no copy of it is safe."""
    lock = simple_run()
    with pytest.raises(LockError, match="the answer rests on fewer than 50 rows"):
        share_safe(lock, fewest=50)
    rare = category_run(["a", "b"] * 30, [1.0, 0.0] + [0.0] * 58, [float(n % 7) for n in range(60)])
    with pytest.raises(LockError, match="fewer than 5 rows may differ from all others in the outcome"):
        share_safe(rare)
    with pytest.raises(ValueError, match="a group of one row is a row"):
        share_safe(lock, fewest=1)


def test_a_number_that_marks_a_few_rows_counts_as_a_level() -> None:
    """A 0/1 column with three ones takes those rows up; its coefficient does not stand."""
    import pandas as pd

    draw = np.random.default_rng(5)
    mark = np.zeros(80)
    mark[:3] = 1
    x = draw.normal(10, 3, 80).round(3)
    y = (5 + 2 * x + 60 * mark + draw.normal(0, 1, 80)).round(3)
    plan = beforehand.plan_from_mapping(
        {
            "language": 1, "title": "Invented", "question": "Can a row be found?",
            "data": {"file": "t.csv"}, "outcome": {"column": "y"},
            "predictors": [{"column": "mark"}, {"column": "x"}], "influence": {"at_most": 0.0},
        }
    )  # fmt: skip
    safe = share_safe(beforehand.run(plan, pd.DataFrame({"mark": mark, "x": x, "y": y})).lock)
    held = {term["term"]: term["coefficient"] for term in safe["answer"]["terms"]}
    assert held["mark"] is None
    assert held["intercept"] is None
    assert held["x"] is not None
    assert all("mark" in {term["predictor"] for term in fit["terms"]} for fit in safe["fits"])


@settings(deadline=None)
@given(st.dictionaries(st.text(min_size=1, max_size=3), st.integers(0, 40), min_size=1), st.integers(2, 9))
def test_pooled_levels_hide_small_ones_and_lose_no_row(levels: dict[str, int], fewest: int) -> None:
    """The total stays, each level told is large enough, and so is the pool where there is enough at all."""
    told = pooled(levels, fewest)
    pool = told.get("pooled", {"levels": [], "rows": 0})
    assert sum(told["levels"].values()) + pool["rows"] == sum(levels.values())
    assert sorted([*told["levels"], *pool["levels"]]) == sorted(levels)
    assert all(count >= fewest for count in told["levels"].values())
    if pool["levels"]:
        assert pool["rows"] >= fewest or not told["levels"]


@pytest.mark.parametrize("scenario", ["cold-rooms/cold-rooms", "reading-room/visits", "repair-bench/jobs",
                                      "stream-clarity/samplings"])  # fmt: skip
def test_no_two_fits_of_a_copy_are_on_different_rows(scenario: str) -> None:
    """In the ready plans, alternatives included: one number of rows, no digest, no label of a row."""
    path = Path(__file__).parents[2] / "plans" / f"{scenario}.lock.yaml"
    lock = beforehand.read_lock(path)
    text = safe_text(lock)
    safe = yaml.safe_load(text)
    digest = {fit.id: fit.rows.digest for fit in lock.fits}
    assert len({digest[fit["id"]] for fit in safe["fits"]}) == 1
    for name, other in safe["alternatives"].items():
        of_other = {fit.id: fit.rows.digest for fit in lock.alternatives[name].fits}
        told = {of_other[fit["id"]] for fit in other.get("fits", ())}
        assert told <= {digest[fit["id"]] for fit in safe["fits"]}
    assert not {row.row for row in lock.rows_removed} & set(text.replace('"', " ").split())
    for row in lock.checks.influence:
        assert f" {row.row}" not in text
        assert str(row.cooks_distance) not in text


def test_a_share_safe_bundle_holds_the_copy_and_nothing_made_of_rows(
    racks: Any, plan: Path, tmp_path: Path
) -> None:
    """No lock, no report, no refresh, no rehearsal; it is received and not computed again."""
    for name in (
        "racks.report.html",
        "racks.refresh.yaml",
        "racks.refreshed.lock.yaml",
        "racks.rehearsal.yaml",
    ):
        (plan.parent / name).write_bytes(b"made of rows\n")
    done = beforehand.handover(plan, tmp_path / "racks.zip", share_safe=True)
    files = racks.files_in(tmp_path / "racks.zip")
    assert sorted(files) == [
        "READ-ME.txt", "dictionary.yaml", "lock.schema.json", "manifest.json", "plan.schema.json",
        "racks.plan.yaml", "racks.safe.yaml",
    ]  # fmt: skip
    assert done.share_safe
    assert b"k041" not in b"".join(files.values())
    assert b"made of rows" not in b"".join(files.values())
    got = beforehand.receive(tmp_path / "racks.zip", tmp_path / "got", data=plan.parent / "racks.csv")
    assert (got.safe, got.replay, got.not_replayed) == (
        "racks.safe.yaml", None, "a share-safe copy cannot be replayed",
    )  # fmt: skip

"""``beforehand rehearse`` as a person types it: what it writes, says and refuses."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pandas as pd
import pytest
import yaml
from typer.testing import CliRunner

from beforehand import Engine, read_rehearsal, rehearse
from beforehand.cli.app import app
from beforehand.rehearsing import engines

PLAN = """\
language: 1
title: Ferries
question: What goes with the delay of a crossing?
data: {file: ferries.csv}
outcome: {column: delay, unit: min}
predictors:
  - {column: wind, unit: m/s}
  - {column: cars}
  - {column: swell, unit: m}
  - {column: crew, kind: category, levels: [a, b]}
expects:
  residual_sd: 4
  slopes: {wind: 0.9}
"""


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """An invented plan and table of ferries."""
    rng = np.random.default_rng(12)
    n = 80
    frame = pd.DataFrame(
        {"wind": rng.normal(8, 3, n), "cars": rng.poisson(20, n), "swell": rng.gamma(2, 0.5, n)}
    )
    frame["crew"] = rng.choice(["a", "b"], n)
    frame["delay"] = (0.9 * frame["wind"] + rng.normal(0, 4, n)).round(2)
    frame.round(3).to_csv(tmp_path / "ferries.csv", index=False)
    (tmp_path / "ferries.plan.yaml").write_text(PLAN, encoding="utf-8")
    return tmp_path


@pytest.fixture
def typed(monkeypatch, place):
    """Run a command in the folder of the plan."""
    monkeypatch.chdir(place)
    monkeypatch.setenv("COLUMNS", "100")
    runner = CliRunner()

    def run(line: str) -> SimpleNamespace:
        found = runner.invoke(app, line.split())
        return SimpleNamespace(code=found.exit_code, out=found.stdout, err=found.stderr)

    return run


def files(place: Path) -> set[str]:
    """Names of what stands in the folder."""
    return {one.name for one in place.iterdir()}


def test_the_record_has_the_promised_names(place, typed):
    """Every figure that is an estimate has its Monte Carlo error."""
    assert typed("run ferries.plan.yaml --quiet").code == 0
    found = typed(
        "rehearse ferries.plan.yaml --replicates 120 --rows 60,90 --workers 1 --scenario noise "
        "--scenario expected --scenario resample --scenario hold_out"
    )
    assert found.code == 0, found.err
    made = yaml.safe_load((place / "ferries.rehearsal.yaml").read_text(encoding="utf-8"))
    assert made["rehearsal"] == 1
    assert made["replicates"] == 120
    worlds = made["scenarios"]
    assert set(worlds) == {"noise", "expected", "resample", "hold_out"}
    assert set(worlds["noise"]["any_adopted"]) == {"value", "mc_error"}
    assert list(worlds["noise"]["adopted"]) == ["wind", "cars", "swell", "crew"]
    assert {"mean", "q05", "q50", "q95"} <= set(worlds["noise"]["r_squared"])
    assert worlds["noise"]["calibrated"]["p_of_r_squared"]["value"] < 0.05
    expected = worlds["expected"]
    assert next(iter(expected)) == "any_without_effect_adopted"
    assert expected["predictors"]["wind"]["true"] == 0.9
    assert {"power", "exaggeration", "wrong_sign", "coverage"} <= set(expected["predictors"]["wind"])
    assert [one["rows"] for one in expected["by_rows"]] == [80, 60, 90]
    half, boot = worlds["resample"]["half_samples"], worlds["resample"]["bootstrap"]
    assert half["models"][0]["predictors"]
    assert half["different_models"] >= 1
    assert {"apparent", "optimism", "corrected"} == set(boot["r_squared"])
    assert set(boot["calibration_slope"]) == {"value", "mc_error"}
    assert {"folds", "rmse", "rmse_mean_model", "r_squared"} <= set(worlds["hold_out"])
    assert "ferries.rehearsal.part" not in files(place)


def test_the_same_record_for_any_number_of_workers_and_in_python(place, typed):
    """One process, two, and the function: the same bytes above the environment."""
    line = "rehearse ferries.plan.yaml --replicates 130 --scenario noise --scenario expected"
    assert typed(f"{line} --workers 1").code == 0
    one = (place / "ferries.rehearsal.yaml").read_bytes()
    assert typed(f"{line} --workers 2 -o two.rehearsal.yaml").code == 0
    assert (place / "two.rehearsal.yaml").read_bytes() == one
    made = rehearse(
        "ferries.plan.yaml", replicates=130, scenarios=("noise", "expected"), engine=Engine(workers=2)
    )
    assert made.record == read_rehearsal(place / "ferries.rehearsal.yaml")


def test_it_replays(place, typed):
    """The record comes out again; changed by hand it does not open."""
    assert typed("rehearse ferries.plan.yaml --replicates 100 --rows 50").code == 0
    again = typed("replay ferries.rehearsal.yaml")
    assert again.code == 0, again.err
    assert "Every byte" in again.out
    record = place / "ferries.rehearsal.yaml"
    record.write_text(record.read_text(encoding="utf-8").replace("replicates: 100", "replicates: 900"))
    broken = typed("replay ferries.rehearsal.yaml")
    assert broken.code == 2
    assert "changed after it was written" in broken.err


def test_a_record_of_another_plan_or_table_is_not_replayed(place, typed):
    """One line says which of them is another."""
    assert typed("rehearse ferries.plan.yaml --replicates 100 --scenario noise").code == 0
    plan = place / "ferries.plan.yaml"
    plan.write_text(PLAN + "alpha: 0.1\n", encoding="utf-8")
    assert "decided otherwise" in typed("replay ferries.rehearsal.yaml").err
    plan.write_text(PLAN, encoding="utf-8")
    table = place / "ferries.csv"
    table.write_text(table.read_text().replace(",a,", ",b,", 3))
    found = typed("replay ferries.rehearsal.yaml")
    assert found.code == 2
    assert "another table" in found.err


def test_what_looks_at_the_outcome_waits_for_a_run(place, typed):
    """Before a run the default leaves it out and says so; named, it is done and stands as a look."""
    found = typed("rehearse ferries.plan.yaml --replicates 100")
    assert found.code == 0
    assert "resample: it looks at the outcome" in " ".join(found.out.split())
    assert "ferries.looks" not in files(place)
    assert read_rehearsal(place / "ferries.rehearsal.yaml").scenarios.resample is None
    found = typed("rehearse ferries.plan.yaml --replicates 100 --scenario resample")
    assert found.code == 0
    assert "stands in the register of looks" in found.err
    assert "ferries.looks" in files(place)
    assert "ferries.lock.yaml" not in files(place)


def test_a_dry_run_is_marked_in_every_file(place, typed):
    """The lock says that it is scrambled, replays, is traced as such and is never taken for a result."""
    found = typed("rehearse ferries.plan.yaml --scenario scrambled")
    assert found.code == 0, found.err
    assert files(place) == {
        "ferries.csv", "ferries.plan.yaml", "ferries.rehearsal.yaml", "ferries.scrambled.lock.yaml",
    }  # fmt: skip
    lock = yaml.safe_load((place / "ferries.scrambled.lock.yaml").read_text(encoding="utf-8"))
    assert lock["scrambled"]["seed"] == 20261201
    assert "nothing here is a result" in lock["scrambled"]["says"]
    assert typed("replay ferries.scrambled.lock.yaml").code == 0
    assert "nothing here is a result" in typed("trace ferries.scrambled.lock.yaml wind").out
    refused = typed("refresh ferries.plan.yaml --data ferries.csv --against ferries.scrambled.lock.yaml")
    assert refused.code == 2
    assert "dry run" in refused.err


def test_a_run_and_a_trace_quote_the_rehearsal_of_their_plan(place, typed):
    """And only of their plan as it is."""
    assert typed("rehearse ferries.plan.yaml --replicates 100").code == 0
    told = " ".join(typed("run ferries.plan.yaml").out.split())
    assert "p-values after this selection: in pure noise this plan adopts something in" in told
    assert "Rehearsed, this plan adopts wind" in " ".join(typed("trace ferries.lock.yaml wind").out.split())
    (place / "ferries.plan.yaml").write_text(PLAN + "alpha: 0.1\n", encoding="utf-8")
    assert "As rehearsed" not in typed("run ferries.plan.yaml").out


def test_without_a_table_the_expected_world_is_drawn(place, typed):
    """From what the plan declares; each predictor that it does not declare is a line, and nothing is left."""
    (place / "ferries.csv").unlink()
    found = typed("rehearse ferries.plan.yaml --replicates 100")
    assert found.code == 2
    lines = found.err.splitlines()
    assert [line.split(":")[2].strip() for line in lines] == [
        f"expects.predictors.{name}" for name in ("wind", "cars", "swell", "crew")
    ]
    assert files(place) == {"ferries.plan.yaml"}
    declared = (
        "  predictors:\n    wind: {mean: 8, sd: 3}\n    cars: {mean: 20, sd: 4}\n"
        "    swell: {mean: 1, sd: 0.5}\n"
        "    crew: {shares: {a: 50%, b: 50%}}\n  correlations:\n    - {between: [wind, swell], r: 0.6}\n"
    )
    (place / "ferries.plan.yaml").write_text(PLAN + declared, encoding="utf-8")
    found = typed("rehearse ferries.plan.yaml --replicates 100 --rows 40,160")
    assert found.code == 0, found.err
    made = read_rehearsal(place / "ferries.rehearsal.yaml")
    assert made.data is None
    assert made.scenarios.expected is not None
    power = [one.power["wind"].value for one in made.scenarios.expected.by_rows]
    assert power[0] < power[1]
    assert typed("replay ferries.rehearsal.yaml").code == 0


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ("--scenario expected", "expects"),
        ("--rows 100,many", "'many' is no number of rows"),
        ("--rows 2", "'2' is no number of rows"),
        ("--scheduler tcp://127.0.0.1:1", "belongs to --engine dask"),
        ("--engine dask", "needs the address of a scheduler"),
        ("--scenario nois", "'nois' is not one of"),
        ("--replicates 0", "0 is not between 1 and 10,000,000"),
        ("--workers 0", "0 is not between 1 and 1,024"),
        ("--seed -1", "-1 is not between 0 and"),
        ("--data none.csv", "none.csv: there is no such file"),
        ("-o no/where.yaml", "its folder does not exist"),
    ],
)
def test_what_cannot_be_done_is_one_line_and_leaves_nothing(place, typed, line, said):
    """Exit code 2, no file."""
    plan = PLAN.split("expects:")[0] if line == "--scenario expected" else PLAN
    (place / "ferries.plan.yaml").write_text(plan, encoding="utf-8")
    before = files(place)
    found = typed(f"rehearse ferries.plan.yaml {line}")
    assert found.code == 2
    assert said in " ".join(found.err.split())
    assert "Traceback" not in found.err
    assert files(place) == before


def test_few_replicates_are_warned_of_with_the_width_of_their_error(place, typed):
    """50 replicates: a share near 5 % is known to 3.1 points."""
    found = typed("rehearse ferries.plan.yaml --replicates 50 --scenario noise --json")
    assert found.code == 0
    assert "3.1 percentage points" in found.err
    assert yaml.safe_load(found.out)["scenarios"]["noise"]["any_adopted"]["mc_error"] > 0


def test_a_file_that_a_person_wrote_is_not_replaced(place, typed):
    """Notes of that name stay as they are."""
    notes = place / "ferries.rehearsal.yaml"
    notes.write_text("my notes\n", encoding="utf-8")
    found = typed("rehearse ferries.plan.yaml --replicates 100 --scenario noise")
    assert found.code == 2
    assert "left as it is" in found.err
    assert notes.read_text(encoding="utf-8") == "my notes\n"


def test_an_interrupted_rehearsal_goes_on_where_it_was(place, typed, monkeypatch):
    """What was finished is kept and told; the end is the same bytes."""
    assert typed("rehearse ferries.plan.yaml --replicates 200 --scenario noise -o whole.yaml").code == 0
    blocks = engines.local.block_trials
    done = 0

    def some(world, block):
        nonlocal done
        if done == 2:
            raise KeyboardInterrupt
        done += 1
        return blocks(world, block)

    with monkeypatch.context() as patched:
        patched.setattr(engines.local, "block_trials", some)
        found = typed("rehearse ferries.plan.yaml --replicates 200 --scenario noise --workers 1")
    assert found.code == 130
    assert "100 of 200 replicates are kept" in found.err
    assert "ferries.rehearsal.part" in files(place)
    assert "ferries.rehearsal.yaml" not in files(place)
    calls = []
    monkeypatch.setattr(
        engines.local, "block_trials", lambda world, block: calls.append(block) or blocks(world, block)
    )
    found = typed("rehearse ferries.plan.yaml --replicates 200 --scenario noise --workers 1 --resume")
    assert found.code == 0
    assert calls == [(100, 150), (150, 200)]
    assert (place / "ferries.rehearsal.yaml").read_bytes() == (place / "whole.yaml").read_bytes()
    assert "ferries.rehearsal.part" not in files(place)


def test_the_bundle_takes_the_rehearsal_and_its_schema_along(place, typed):
    """A colleague can read what was rehearsed."""
    import zipfile

    assert typed("run ferries.plan.yaml --quiet").code == 0
    assert typed("rehearse ferries.plan.yaml --replicates 100 --scenario noise").code == 0
    found = typed("handover ferries.plan.yaml -o ferries.zip")
    assert found.code == 0, found.err
    with zipfile.ZipFile(place / "ferries.zip") as packed:
        assert {"ferries.rehearsal.yaml", "rehearsal.schema.json"} <= set(packed.namelist())


def test_scenarios_rehearsed_before_stay_in_the_record(place, typed):
    """One after the other, of the same plan, table, seed and replicates; else what goes is named."""
    assert typed("rehearse ferries.plan.yaml --replicates 100 --scenario noise").code == 0
    assert typed("rehearse ferries.plan.yaml --replicates 100 --scenario expected").code == 0
    made = read_rehearsal(place / "ferries.rehearsal.yaml")
    assert made.scenarios.noise is not None
    assert made.scenarios.expected is not None
    assert typed("replay ferries.rehearsal.yaml").code == 0
    found = typed("rehearse ferries.plan.yaml --replicates 120 --scenario scrambled")
    assert "noise, expected of the earlier record went" in found.err


def test_what_was_finished_is_not_thrown_away(place, typed, monkeypatch):
    """A part file of this very rehearsal is gone on with, or taken away by its owner."""
    blocks = engines.local.block_trials
    done = 0

    def some(world, block):
        nonlocal done
        if done == 2:
            raise KeyboardInterrupt
        done += 1
        return blocks(world, block)

    with monkeypatch.context() as patched:
        patched.setattr(engines.local, "block_trials", some)
        assert typed("rehearse ferries.plan.yaml --replicates 200 --scenario noise --workers 1").code == 130
    before = (place / "ferries.rehearsal.part").read_bytes()
    found = typed("rehearse ferries.plan.yaml --replicates 200 --scenario expected")
    assert found.code == 2
    assert "--resume goes on with it" in found.err
    assert (place / "ferries.rehearsal.part").read_bytes() == before


def test_the_rehearsal_of_another_table_is_not_quoted(place, typed):
    """A record of other rows says nothing of this run."""
    table = pd.read_csv(place / "ferries.csv")
    table.iloc[:60].to_csv(place / "other.csv", index=False)
    assert typed("rehearse ferries.plan.yaml --replicates 100 --scenario noise --data other.csv").code == 0
    assert read_rehearsal(place / "ferries.rehearsal.yaml").data.file == "other.csv"
    assert typed("replay ferries.rehearsal.yaml --data other.csv").code == 0
    assert "As rehearsed" not in typed("run ferries.plan.yaml").out

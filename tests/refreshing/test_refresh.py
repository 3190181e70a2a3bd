"""A plan on refreshed data: rows, drift, Chow's test, what moved the coefficients, and the verdict."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
import yaml
from scipy import stats
from typer.testing import CliRunner

import beforehand
from beforehand import refresh, run, write_lock
from beforehand.cli.app import app
from beforehand.refreshing import as_mapping, refresh_text
from beforehand.sealing.chain import digest_of

PLAN = """\
language: 1
title: Kettles
question: Does scale slow a kettle?
data: {file: old.csv, row_label: kettle}
outcome: {column: minutes}
predictors:
  - {column: scale, range: [0, 20]}
  - {column: litres}
  - {column: lid, kind: category, levels: ["on", "off"]}
steps: [missing_data, selection]
"""


def kettles(seed=1, n=80, start=0, slope=0.5):
    """Invented kettles."""
    rng = np.random.default_rng(seed)
    scale, litres = rng.uniform(0, 5, n).round(3), rng.uniform(0.5, 2, n).round(3)
    lid = rng.choice(["on", "off"], n)
    minutes = (1 + slope * scale + 2 * litres + 0.8 * (lid == "off") + rng.normal(0, 0.4, n)).round(4)
    labels = [f"k{number:04d}" for number in range(start, start + n)]
    return pd.DataFrame({"kettle": labels, "minutes": minutes, "scale": scale, "litres": litres, "lid": lid})


@pytest.fixture
def folder(tmp_path):
    """A folder with the plan, the old table and its lock."""
    (tmp_path / "kettles.plan.yaml").write_text(PLAN, encoding="utf-8")
    kettles().to_csv(tmp_path / "old.csv", index=False)
    write_lock(run(tmp_path / "kettles.plan.yaml").lock, tmp_path / "kettles.lock.yaml")
    return tmp_path


def found_of(folder, frame, **options):
    """Refresh with a table."""
    frame.to_csv(folder / "new.csv", index=False)
    return refresh(folder / "kettles.plan.yaml", folder / "new.csv", **options)


def design(frame):
    """The old form's columns."""
    lid = (frame["lid"] == "off").astype(float).rename("lid = off")
    return sm.add_constant(pd.concat([frame[["scale", "litres"]], lid], axis=1))


def fit(frame):
    """The old form by statsmodels."""
    return sm.OLS(frame["minutes"], design(frame)).fit()


def changed(seed=2):
    """Thirty new kettles, ten gone, five measured again."""
    old = kettles()
    frame = pd.concat([old.iloc[10:], kettles(seed, 30, start=200)], ignore_index=True)
    frame.loc[[3, 9, 21, 40, 41], "minutes"] += 0.7
    return frame


def test_nothing_new_holds(folder):
    """The same table again: every row the same, no shift, no reason."""
    found = found_of(folder, kettles().sample(frac=1, random_state=1))
    assert (found.verdict, found.reasons) == ("holds", ())
    assert len(found.rows.same) == 80
    assert (found.rows.new, found.rows.gone, found.rows.revised) == ((), (), ())
    assert all(one.shift_in_old_se == 0.0 for one in found.coefficients)
    assert all(one.ks == 0.0 and one.ks_p == 1.0 for one in found.drift if one.ks is not None)
    assert found.chow is None
    assert found.prediction is None


def test_rows_by_label(folder):
    """Each list holds the labels, in canonical order."""
    found = found_of(folder, changed())
    assert found.rows.new == tuple(f"k{number:04d}" for number in range(200, 230))
    assert found.rows.gone == tuple(f"k{number:04d}" for number in range(10))
    assert found.rows.revised == ("k0013", "k0019", "k0031", "k0050", "k0051")
    assert len(found.rows.same) == 65


def test_rows_without_labels_are_matched_by_content(folder):
    """Equal rows are the same one by one; what differs is gone and new."""
    plan = folder / "kettles.plan.yaml"
    plan.write_text(PLAN.replace(", row_label: kettle", ""), encoding="utf-8")
    write_lock(run(plan).lock, folder / "kettles.lock.yaml")
    found = found_of(folder, changed())
    assert (len(found.rows.new), len(found.rows.gone), len(found.rows.same)) == (35, 15, 65)
    assert found.rows.revised == ()
    assert found.rows.matched_by == "content"


def test_drift_as_scipy_and_by_hand(folder):
    """Kolmogorov-Smirnov by scipy; mean differences and level shares by pandas."""
    new = changed()
    new["scale"] = new["scale"] * 1.5
    found = {one.column: one for one in found_of(folder, new).drift}
    old = kettles()
    judge = stats.ks_2samp(old["scale"], new["scale"])
    assert (found["scale"].ks, found["scale"].ks_p) == pytest.approx((judge.statistic, judge.pvalue))
    difference = (new["scale"].mean() - old["scale"].mean()) / old["scale"].std()
    assert found["scale"].standardized_difference == pytest.approx(difference, rel=1e-12)
    shares = [frame["lid"].value_counts(normalize=True) for frame in (old, new)]
    assert found["lid"].total_variation == pytest.approx((shares[0] - shares[1]).abs().sum() / 2)
    assert found["minutes"].role == "outcome"


def test_values_out_of_range_and_levels_that_came_and_went(folder):
    """Where the plan takes them as missing their share is told; so are levels that came and went."""
    text = PLAN.replace('"off"]', '"off", ajar]') + "missing_data: {out_of_range: missing}\n"
    (folder / "kettles.plan.yaml").write_text(text, encoding="utf-8")
    write_lock(run(folder / "kettles.plan.yaml").lock, folder / "kettles.lock.yaml")
    new = kettles()
    new.loc[:7, "scale"] = 99.0
    new["lid"] = new["lid"].replace("off", "ajar")
    found = {one.column: one for one in found_of(folder, new).drift}
    assert (found["scale"].old_out_of_range, found["scale"].new_out_of_range) == (0.0, 0.1)
    assert found["scale"].new_missing == 0.1
    assert (found["lid"].levels_new, found["lid"].levels_gone) == (("ajar",), ("off",))


def test_a_hand_made_total_variation(folder):
    """From 1/2 : 1/2 to 3/4 : 1/4 a quarter of the rows has moved (by definition)."""
    from beforehand.refreshing.drift import _shares
    from beforehand.table import Column

    column = Column(name="g", kind="category", values=np.array([0, 0, 0, 1, -1]), levels=("a", "b", "c"))
    assert _shares(column) == {"a": 0.75, "b": 0.25, "c": 0.0}


@pytest.mark.parametrize("new_rows", [30, 3])
def test_chow_and_prediction_as_statsmodels(folder, new_rows):
    """Both forms of Chow's (1960) test from residual sums of squares; the error of the old equation."""
    old, more = kettles(), kettles(5, new_rows, start=300, slope=0.9)
    both = pd.concat([old, more], ignore_index=True)
    found = found_of(folder, both)
    rss = fit(old).ssr
    if new_rows == 30:
        apart, df = rss + fit(more).ssr, (4, 80 + 30 - 8)
        assert found.chow.form == "two_lines"
    else:
        apart, df = rss, (3, 76)
        assert found.chow.form == "prediction"
    f = ((fit(both).ssr - apart) / df[0]) / (apart / df[1])
    assert found.chow.df == df
    assert found.chow.f == pytest.approx(f, rel=1e-8)
    assert found.chow.p == pytest.approx(stats.f.sf(f, *df), rel=1e-7)
    error = more["minutes"] - fit(old).predict(design(more))
    assert found.prediction.mean_error == pytest.approx(error.mean(), rel=1e-8)
    assert found.prediction.typical_error == pytest.approx(np.sqrt((error**2).mean()), rel=1e-9)
    assert found.prediction.ratio == pytest.approx(np.sqrt((error**2).mean() / fit(old).mse_resid), rel=1e-9)


def test_parts_add_up_to_the_shift(folder):
    """What new, gone and revised rows did adds to the difference of the two fits (Shapley's efficiency)."""
    new = changed()
    found = {one.term: one for one in found_of(folder, new).coefficients}
    before, after = fit(kettles()), fit(new)
    for name, judge in (("intercept", "const"), ("scale", "scale"), ("litres", "litres")):
        one = found[name]
        total = after.params[judge] - before.params[judge]
        assert one.from_new_rows + one.from_gone_rows + one.from_revised_rows == pytest.approx(
            total, rel=1e-6
        )
        assert one.shift_in_old_se == pytest.approx(total / before.bse[judge], rel=1e-6)
        assert one.from_other_form == 0.0


def test_one_source_alone_makes_the_whole_shift(folder):
    """Where only new rows came, they made all of it; where only values were revised, they did."""
    only_new = pd.concat([kettles(), kettles(7, 20, start=500)], ignore_index=True)
    revised = kettles()
    revised.loc[:9, "litres"] += 0.4
    for frame, source in (
        (only_new, "from_new_rows"),
        (revised, "from_revised_rows"),
        (kettles()[:60], "from_gone_rows"),
    ):
        for one in found_of(folder, frame).coefficients:
            parts = {
                name: getattr(one, name) for name in ("from_new_rows", "from_gone_rows", "from_revised_rows")
            }
            assert parts.pop(source) == pytest.approx(one.new - one.old, rel=1e-6)
            assert set(parts.values()) == {0.0}


def test_all_rows_replaced(folder):
    """A whole new table: the new rows come before the old ones go, and the parts still add up."""
    found = found_of(folder, kettles(9, 90, start=900))
    for one in found.coefficients:
        assert one.from_new_rows + one.from_gone_rows == pytest.approx(one.new - one.old, rel=1e-6)
        assert one.from_revised_rows == 0.0


@pytest.mark.parametrize(
    ("slope", "verdict", "word"),
    [
        (0.5, "holds", ""),
        (0.9, "moved", "scale moves by"),
        (0.0, "broken", "scale is no longer"),
        (-0.5, "broken", "sign of scale turns"),
    ],
)
def test_verdicts(folder, slope, verdict, word):
    """By the plan's own tolerances: the same numbers, others, or another answer."""
    plan = folder / "kettles.plan.yaml"
    plan.write_text(PLAN + "refresh: {coefficient: 4, r_squared: 50%, rulings: any}\n", encoding="utf-8")
    write_lock(run(plan).lock, folder / "kettles.lock.yaml")
    found = found_of(folder, kettles(13, 400, start=0, slope=slope))
    assert found.verdict == verdict, found.reasons
    assert any(word in reason for reason in found.reasons) or not word


def test_a_table_that_breaks_the_contract(folder):
    """A new level, a value out of range and a text are reasons, and there is no new lock."""
    new = changed().astype({"scale": object})
    new.loc[0, "lid"], new.loc[1, "scale"], new.loc[2, "scale"] = "ajar", 99, "much"
    found = found_of(folder, new)
    assert (found.verdict, found.lock, found.new) == ("broken", None, None)
    assert len(found.reasons) >= 2
    assert any("'ajar' is not a declared level" in reason for reason in found.reasons)


def test_learned_quantities_are_replayed_where_the_plan_says_so(folder):
    """The old median fills the new gaps; the lock says so and replays to the byte."""
    old = kettles()
    old.loc[:7, "litres"] = np.nan
    old.to_csv(folder / "old.csv", index=False)
    text = PLAN + "missing_data: {fill: {litres: median}}\nrefresh: {learned: replay}\n"
    (folder / "kettles.plan.yaml").write_text(text, encoding="utf-8")
    write_lock(run(folder / "kettles.plan.yaml").lock, folder / "kettles.lock.yaml")
    new = changed()
    new.loc[:3, "litres"] = np.nan
    found = found_of(folder, new)
    (fill,) = found.lock.checks.fills
    assert fill.value == pytest.approx(old["litres"].median(), rel=1e-9)
    assert fill.value != pytest.approx(new["litres"].median(), rel=1e-6)
    assert dict(found.lock.learned.fills) == {"litres": fill.value}
    write_lock(found.lock, folder / "kettles.refreshed.lock.yaml")
    again = beforehand.replay(folder / "kettles.refreshed.lock.yaml", data=folder / "new.csv")
    assert again.same_bytes
    (folder / "kettles.plan.yaml").write_text(text.replace("replay", "anew"), encoding="utf-8")
    write_lock(run(folder / "kettles.plan.yaml").lock, folder / "kettles.lock.yaml")
    anew = found_of(folder, new)
    assert anew.lock.learned is None
    assert anew.lock.checks.fills[0].value == pytest.approx(new["litres"].median(), rel=1e-9)


def test_hashed_labels_stay_hashed(folder):
    """No label stands in the record of a plan that hides them."""
    plan = folder / "kettles.plan.yaml"
    plan.write_text(
        PLAN.replace("row_label: kettle", "row_label: kettle, labels_in_lock: hashed"), encoding="utf-8"
    )
    write_lock(run(plan).lock, folder / "kettles.lock.yaml")
    new = changed()
    assert "k0" not in refresh_text(found_of(folder, new)).replace("sha256", "")
    new.loc[0, "lid"] = "ajar"
    assert "k0" not in refresh_text(found_of(folder, new)).replace("sha256", "")


def test_the_record(folder):
    """The promised keys, a digest that fits, and the same bytes for the same refresh."""
    text = refresh_text(found_of(folder, changed()))
    record = yaml.safe_load(text)
    assert text == refresh_text(found_of(folder, changed()))
    assert record["digest"] == digest_of(record)
    assert set(record["rows"]) >= {"new", "gone", "revised", "same"}
    assert {
        "term",
        "old",
        "new",
        "shift_in_old_se",
        "from_new_rows",
        "from_gone_rows",
        "from_revised_rows",
    } <= set(record["coefficients"][0])
    assert record["verdict"] in ("holds", "moved", "broken")
    assert isinstance(record["rulings_flipped"], list)


@pytest.fixture
def invoke(monkeypatch):
    """Type a command."""
    monkeypatch.setenv("COLUMNS", "100")
    runner = CliRunner()
    return lambda *words: runner.invoke(app, [str(word) for word in words])


def test_as_a_person_types_it(folder, invoke):
    """0 when it holds, 3 when it moved; a lock, a record and a look are left."""
    kettles().to_csv(folder / "new.csv", index=False)
    done = invoke("refresh", folder / "kettles.plan.yaml", "--data", folder / "new.csv")
    assert done.exit_code == 0, done.stderr
    assert done.stdout.startswith("Holds")
    kettles(13, 400, slope=0.9).to_csv(folder / "new.csv", index=False)
    done = invoke("refresh", folder / "kettles.plan.yaml", "--data", folder / "new.csv", "--json")
    assert done.exit_code == 3
    assert json.loads(done.stdout)["verdict"] in ("moved", "broken")
    assert yaml.safe_load((folder / "kettles.refresh.yaml").read_text(encoding="utf-8"))["refresh"] == 1
    beforehand.read_lock(folder / "kettles.refreshed.lock.yaml")
    assert len((folder / "kettles.looks").read_text(encoding="utf-8").splitlines()) == 3


@pytest.mark.parametrize(
    ("spoil", "said"),
    [
        (lambda folder: (folder / "kettles.lock.yaml").unlink(), "no such file"),
        (lambda folder: (folder / "new.csv").unlink(), "no such file"),
        (lambda folder: kettles(3).to_csv(folder / "old.csv", index=False), "--old"),
        (
            lambda folder: (folder / "kettles.plan.yaml").write_text(PLAN + "alpha: 0.1\n", encoding="utf-8"),
            "compare the two plans first",
        ),
        (
            lambda folder: (folder / "kettles.refresh.yaml").write_text("mine", encoding="utf-8"),
            "left as it is",
        ),
    ],
)
def test_what_cannot_be_refreshed(folder, invoke, spoil, said):
    """One line, exit code 2, nothing written."""
    kettles().to_csv(folder / "new.csv", index=False)
    spoil(folder)
    before = sorted(path.name for path in folder.iterdir())
    done = invoke("refresh", folder / "kettles.plan.yaml", "--data", folder / "new.csv")
    assert done.exit_code == 2
    assert said in done.stderr
    assert sorted(path.name for path in folder.iterdir()) == before


def test_killed_while_it_refreshes(folder):
    """Whatever is there after a kill reads back whole."""
    changed().to_csv(folder / "new.csv", index=False)
    environment = {**os.environ, "PYTHONPATH": str(Path(beforehand.__file__).parents[1])}
    code = (
        "import sys\nfrom beforehand.cli import main\n"
        "for _ in range(50):\n"
        "    sys.argv = ['beforehand', 'refresh', 'kettles.plan.yaml', '--data', 'new.csv']\n"
        "    try:\n        main()\n    except SystemExit:\n        pass\n"
    )
    random = np.random.default_rng(3)
    for _ in range(10):
        process = subprocess.Popen(
            [sys.executable, "-c", code], cwd=folder, env=environment,
            stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )  # fmt: skip
        with pytest.raises(subprocess.TimeoutExpired):
            process.wait(float(random.uniform(0.5, 2.0)))
        process.kill()
        process.wait(30)
        for name in ("kettles.lock.yaml", "kettles.refreshed.lock.yaml"):
            if (folder / name).exists():
                beforehand.read_lock(folder / name)
        if (folder / "kettles.refresh.yaml").exists():
            record = yaml.safe_load((folder / "kettles.refresh.yaml").read_text(encoding="utf-8"))
            assert record["digest"] == digest_of(record)
    shutil.rmtree(folder)


def test_as_mapping_is_plain(folder):
    """What --json prints is plain data."""
    json.dumps(as_mapping(found_of(folder, changed())))

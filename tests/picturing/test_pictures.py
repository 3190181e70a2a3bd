"""What is plotted is what the lock says; what there is nothing of has no picture."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from beforehand.fit.influence import measures_of
from beforehand.lock import Lock
from beforehand.picturing import figure_of, pictures_of
from beforehand.picturing.clouds import centres
from beforehand.picturing.correlations import correlations
from beforehand.picturing.pull import Limits, cook_curve
from beforehand.picturing.trail import MOST_LINES, lines_of, rows_of, stations_of


def marked(picture, name):
    """Points of every line or patch of a name, axes by axes."""
    found = []
    for axes in figure_of(picture).axes:
        for line in axes.lines:
            if line.get_gid() == name:
                found.append((list(map(float, line.get_xdata())), list(map(float, line.get_ydata()))))
    return found


def patches(picture, name):
    """Patches of a name."""
    return [p for axes in figure_of(picture).axes for p in axes.patches if p.get_gid() == name]


def words(picture):
    """Every text in a picture."""
    figure = figure_of(picture)
    return [t.get_text() for axes in figure.axes for t in axes.texts] + [t.get_text() for t in figure.texts]


def test_every_picture_of_a_whole_run_has_its_words(lock):
    """A question, a text alternative and how to read it, each of its own."""
    found = pictures_of(lock)
    assert set(found) == {
        "trail", "coefficients", "contributions", "straight", "spread", "normal", "pull", "columns",
        "correlations",
    }  # fmt: skip
    for name, picture in found.items():
        assert picture.name == name
        assert picture.title.endswith("?")
        assert picture.alt.endswith(".")
        assert picture.note.endswith(".")
        assert picture.title in words(picture)
    assert len({picture.title for picture in found.values()}) == len(found)


def test_coefficients_are_those_of_the_answer(lock):
    """Marks at the standardized coefficients, lines over their intervals in the same scale."""
    picture = pictures_of(lock)["coefficients"]
    terms = sorted(
        (t for t in lock.answer.terms if t.standardized is not None), key=lambda t: -abs(t.standardized)
    )
    assert [x[0] for x, _ in marked(picture, "effect")] == [t.standardized for t in terms]
    for (ends, _), term in zip(marked(picture, "interval"), terms, strict=True):
        scale = term.standardized / term.coefficient
        assert ends == pytest.approx([term.low * scale, term.high * scale])


def test_contributions_are_those_of_the_answer(lock):
    """Bars as long as the semipartial R²; the strip of all adds up to one."""
    picture = pictures_of(lock)["contributions"]
    sizes = sorted((p.semipartial_r_squared for p in lock.answer.predictors), reverse=True)
    assert [bar.get_width() for bar in patches(picture, "part")] == pytest.approx(sizes)
    assert sum(bar.get_width() for bar in patches(picture, "whole")) == pytest.approx(1.0)


def test_the_trail_ends_where_the_ruling_was_made(lock):
    """Steps, rulings and rows as the lock has them."""
    stations = stations_of(lock)
    step_of = {ruling.id: ruling.step for ruling in lock.rulings}
    for line in lines_of(lock, stations):
        fate = lock.predictors[line.name]
        assert line.kept == (fate.verdict != "removed")
        assert line.ruling == fate.ruling
        assert stations[line.end] == ("answer" if line.kept else step_of[fate.ruling])
    picture = pictures_of(lock)["trail"]
    said = words(picture)
    for name, fate in lock.predictors.items():
        assert name in said
        assert fate.ruling in said
    assert len(marked(picture, "kept")) == sum(f.verdict != "removed" for f in lock.predictors.values())
    assert "idle" in picture.alt


def test_the_trail_counts_rows_as_the_ledger_does(make_table, make_lock):
    """Ineligible rows, missing cells and a removed row, each where it left."""
    made = make_table(120)
    made.loc[3, "heat"] = np.nan
    made.loc[7, "use"] = made["use"].max() + 400.0
    made.loc[7, "load"] = 400.0
    made["site"] = ["yes"] * 115 + ["no"] * 5
    found = make_lock(
        made,
        leave_out=("site",),
        eligibility=[{"column": "site", "is": "yes", "because": "others are on trial"}],
        influence={"remove_when": {"coefficient": 0.5}},
    )
    stations = stations_of(found)
    rows = rows_of(found, stations)
    assert sum(one.left for one in rows) == found.ledger[0].rows - found.ledger[-1].rows
    assert rows[-1].stayed == found.answer.rows
    by_step = {stations[one.station]: one.left for one in rows}
    assert by_step["missing_data"] == 1
    assert by_step["influence"] == sum(row.step == "influence" for row in found.rows_removed) > 0


def test_clouds_stand_at_the_middle_of_their_cells(lock):
    """Every cell is one dot, and lines go through the recorded points."""
    one = lock.pictures.straight[0]
    picture = pictures_of(lock)["straight"]
    axes = figure_of(picture).axes[0]
    drawn = np.concatenate([p.get_path().vertices[::2] for p in axes.patches if p.get_gid() == "cloud"])
    expected = np.array([(x, y) for x, y, _ in centres(one.cloud)])
    assert sorted(map(tuple, drawn.tolist())) == sorted(map(tuple, expected.tolist()))
    (x, y), *_ = marked(picture, "means")
    assert list(zip(x, y, strict=True)) == list(one.line)


def test_spread_and_normal_show_the_recorded_numbers(lock):
    """Means, widths and quantiles as in the lock."""
    found = pictures_of(lock)
    ((x, y),) = marked(found["spread"], "means")
    assert list(zip(x, y, strict=True)) == list(lock.pictures.spread.line)
    (_, up), (_, down) = marked(found["spread"], "width")
    assert up == [-value for value in down] == [value for _, value in lock.pictures.spread.width]
    ((_, quantiles),) = marked(found["normal"], "quantiles")
    assert quantiles == list(lock.pictures.normal)


def test_flagged_rows_stand_at_their_measures(lock):
    """Rings and crosses are the rows of the record."""
    picture = pictures_of(lock)["pull"]
    rows = [row for row in lock.checks.influence if row.studentized_residual is not None]
    assert rows
    stays = sorted((row.leverage, row.studentized_residual) for row in rows if row.stays)
    drawn = sorted((x[0], y[0]) for x, y in marked(picture, "stays"))
    assert drawn == stays


def test_cooks_curve_is_where_cooks_distance_is():
    """Held against the measures themselves."""
    n, p, cook = 40, 4, 0.1
    for h, t in cook_curve(Limits(n=n, p=p, leverage=None, residual=None, cook=cook), [0.05, 0.2, 0.5]):
        rss, df = 7.0, n - p
        # The raw residual whose external studentized residual is t.
        squared = t * t * df / (df - 1 + t * t)
        e = np.sqrt(squared * rss / df * (1 - h))
        found = measures_of(np.array([h]), np.array([e]), rss=rss, p=p, df=df)
        assert found.external[0] == pytest.approx(t)
        assert found.cooks_distance[0] == pytest.approx(cook)


def test_correlations_are_those_of_the_record(lock):
    """Stems as long as the correlations with the outcome."""
    picture = correlations(lock)
    drawn = [x[0] for x, _ in marked(picture, "outcome")]
    assert drawn == [one.r for one in lock.pictures.with_outcome]


def test_a_mean_as_the_answer_has_a_trail_and_columns_only(make_table, make_lock):
    """Nothing empty is drawn."""
    made = make_table()
    made["use"] = np.random.default_rng(0).normal(size=len(made)).round(3)
    found = make_lock(made)
    assert found.status == "mean_only"
    assert set(pictures_of(found)) == {"trail", "columns", "correlations"}


def test_a_stopped_run_has_no_picture_of_an_answer(make_table, make_lock):
    """It stops before any fit that could be shown, or shows the one it has."""
    made = make_table()
    made["use"] = made["heat"] ** 3
    found = make_lock(
        made[["heat", "use"]],
        transforms={"when": []},
        final_checks={"if_curved": "stop"},
    )
    assert found.status == "stopped"
    drawn = pictures_of(found)
    assert {"trail", "columns"} <= set(drawn)
    for picture in drawn.values():
        figure_of(picture)
    assert "the point where the run stopped" in drawn["trail"].alt


def test_a_lock_of_an_earlier_version_has_fewer_pictures(lock):
    """Without the part the answer can still be shown."""
    older: Lock = lock.model_copy(update={"pictures": None})
    assert set(pictures_of(older)) == {"trail", "coefficients", "contributions"}


def test_many_predictors_are_limited_and_it_is_said(make_lock):
    """Seventy numbers: no picture is taller than a page, and each says what it leaves out."""
    rng = np.random.default_rng(2)
    made = pd.DataFrame(rng.normal(size=(300, 70)).round(3), columns=[f"quantity {k}" for k in range(70)])
    made["use"] = (made.to_numpy()[:, :60] @ np.ones(60) + rng.normal(size=300)).round(3)
    found = pictures_of(make_lock(made))
    for picture in found.values():
        assert picture.height < 10.0, picture.name
    assert len(marked(found["trail"], "kept")) + len(marked(found["trail"], "leaves")) == MOST_LINES - 1
    assert "more" in " ".join(words(found["trail"]))
    for name in ("coefficients", "contributions", "straight", "columns", "correlations"):
        assert "shown" in found[name].note.lower()

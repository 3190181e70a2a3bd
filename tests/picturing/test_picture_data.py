"""What pictures are drawn from: judged by numpy and statsmodels, bounded, the same for any order of rows."""

from __future__ import annotations

import numpy as np
import pytest

from beforehand.handing.safe import share_safe
from beforehand.lock import lock_from_text, lock_text, sealed_lock
from beforehand.record.pictures import histogram_of
from beforehand.record.plane import plane_of


def grid(cloud):
    """Counts of a cloud, shape (columns, rows)."""
    made = np.zeros((cloud.columns, cloud.rows), dtype=int)
    for column, row, count in cloud.cells:
        made[column, row] = count
    return made


@pytest.mark.parametrize("n", [1, 2, 19, 1000, 70_000])
def test_a_cloud_counts_what_numpy_counts(n):
    """The two-dimensional histogram of numpy is the judge."""
    rng = np.random.default_rng(n)
    x, y = rng.normal(size=n), rng.exponential(size=n)
    plane = plane_of(x, y)
    cloud = plane.cloud
    edges = [[cloud.x_low, cloud.x_high], [cloud.y_low, cloud.y_high]]
    if n > 1:
        expected, _, _ = np.histogram2d(x, y, bins=(48, 32), range=edges)
        # A point on the edge of two cells may fall on either side in the last digit.
        assert np.abs(grid(cloud) - expected).sum() <= 2
    assert sum(count for *_, count in cloud.cells) == n
    assert len(cloud.cells) <= 48 * 32
    assert len(plane.line) == len(plane.width) <= 24


def test_the_line_is_made_of_means_of_groups():
    """Groups are found again by their sizes in the order of x; numpy's mean is the judge."""
    rng = np.random.default_rng(3)
    x = rng.permutation(np.arange(960.0))
    y = x**2 + rng.normal(size=960)
    plane = plane_of(x, y)
    order = np.argsort(x)
    start = 0
    for (mean_x, mean_y), (_, size) in zip(plane.line, plane.width, strict=True):
        length = round((mean_x - x[order[start]]) * 2) + 1
        rows = order[start : start + length]
        assert mean_x == pytest.approx(x[rows].mean(), rel=1e-9)
        assert mean_y == pytest.approx(y[rows].mean(), rel=1e-7, abs=1e-3)
        assert size == pytest.approx(np.sqrt((y[rows] ** 2).mean()), rel=1e-6, abs=1e-2)
        start += length
    assert start == 960


def test_the_order_of_points_changes_nothing():
    """Not even a last digit."""
    rng = np.random.default_rng(4)
    x, y = rng.normal(size=50_000) * 1e3, rng.standard_cauchy(size=50_000)
    turned = rng.permutation(50_000)
    assert plane_of(x, y) == plane_of(x[turned], y[turned])


@pytest.mark.parametrize(
    ("x", "y"),
    [
        (np.full(9, 3.0), np.full(9, -0.0)),
        (np.array([1e-310, 2e-310, 3e-310]), np.array([1.0, 2.0, 3.0])),
        (np.array([-1e300, 1e300]), np.array([0.0, 1.0])),
        (np.array([1.0, np.nextafter(1.0, 2.0)]), np.array([0.0, 1.0])),
    ],
)
def test_strange_values_still_have_a_place(x, y):
    """Constant, tiny, huge, next to each other."""
    plane = plane_of(x, y)
    assert sum(count for *_, count in plane.cloud.cells) == len(x)
    assert all(np.isfinite(value) for point in (*plane.line, *plane.width) for value in point)


def test_no_points_or_values_beyond_all_bounds_make_no_plane():
    """Differences of the largest doubles overflow."""
    assert plane_of(np.array([]), np.array([])) is None
    assert plane_of(np.array([-1.7e308, 1.7e308]), np.array([0.0, 1.0])) is None


def test_a_histogram_counts_what_numpy_counts():
    """The histogram of numpy over the same edges is the judge."""
    values = np.random.default_rng(1).gamma(2.0, size=5000)
    made = histogram_of("x", values)
    expected, _ = np.histogram(values, bins=len(made.counts), range=(made.low, made.high))
    assert len(made.counts) == 20
    assert np.abs(np.array(made.counts) - expected).sum() <= 2


@pytest.mark.parametrize("top", [1, 7, 19, 20, 45, 1000])
def test_whole_numbers_have_as_many_to_each_bin(top):
    """A column with each whole number once is level, but for the last bin."""
    made = histogram_of("x", np.arange(top + 1.0))
    assert sum(made.counts) == top + 1
    assert len(made.counts) <= 20
    assert len(set(made.counts[:-1])) <= 1


def test_huge_and_constant_columns_have_a_histogram():
    """The largest doubles, a constant, a single value."""
    assert sum(histogram_of("x", np.array([-1.7e308, 0.5, 1.7e308])).counts) == 3
    assert sum(histogram_of("x", np.full(5, 2.25)).counts) == 5
    assert histogram_of("x", np.array([7.0])).counts == (1,)


def test_a_lock_holds_what_statsmodels_finds(lock, table):
    """Residuals, leverages, studentized residuals and component plus residual by statsmodels."""
    import statsmodels.api as sm

    names = [one.predictor for one in lock.answer.predictors]
    assert set(names) == {"heat", "load", "kind"}
    design = sm.add_constant(
        table[["heat", "load"]].assign(kind=(table["kind"] == "old").astype(float)).to_numpy(float)
    )
    gone = [int(row.row) - 1 for row in lock.rows_removed]
    kept = np.setdiff1d(np.arange(len(table)), gone)
    fit = sm.OLS(table["use"].to_numpy()[kept], design[kept]).fit()
    influence = fit.get_influence()
    data = lock.pictures
    assert np.array(data.normal) == pytest.approx(
        np.quantile(fit.resid, (np.arange(61) + 0.5) / 61, method="hazen"), rel=1e-8, abs=1e-9
    )
    assert data.pull.x_high == pytest.approx(influence.hat_matrix_diag.max(), rel=1e-8)
    assert data.pull.x_low == 0.0
    assert data.pull.y_high == pytest.approx(influence.resid_studentized_external.max(), rel=1e-8)
    assert data.spread.cloud.x_low == pytest.approx(fit.fittedvalues.min(), rel=1e-8)
    straight = {one.predictor: one for one in data.straight}
    assert list(straight) == ["heat", "load"]
    part = fit.params[1] * (design[kept, 1] - design[kept, 1].mean()) + fit.resid
    assert straight["heat"].cloud.y_high == pytest.approx(part.max(), rel=1e-8)
    slope = (straight["heat"].at_high - straight["heat"].at_low) / (
        straight["heat"].cloud.x_high - straight["heat"].cloud.x_low
    )
    assert slope == pytest.approx(fit.params[1], rel=1e-8)
    r = {one.predictor: one.r for one in data.with_outcome}
    for name in ("heat", "load", "idle"):
        expected = np.corrcoef(table[name].to_numpy()[kept], table["use"].to_numpy()[kept])[0, 1]
        assert r[name] == pytest.approx(expected, rel=1e-8)


def test_a_transformed_predictor_is_shown_under_its_rung(make_table, make_lock):
    """The cloud is of the root, the lock says so."""
    made = make_table(300)
    made["use"] = made["use"] + 30.0 * np.sqrt(made["load"]) - made["load"] * 0.2
    found = make_lock(
        made, transforms={"when": ["curvature"], "try": ["square_root"], "if_none_works": "keep_as_is"}
    )
    one = next(one for one in found.pictures.straight if one.predictor == "load")
    assert one.transform == "square_root"
    assert one.cloud.x_high == pytest.approx(np.sqrt(made["load"].max()), rel=1e-9)


def test_rows_in_another_order_give_the_same_part(make_table, make_lock):
    """The whole part is equal, not nearly."""
    made = make_table(400, seed=8)
    turned = made.sample(frac=1.0, random_state=1).reset_index(drop=True)
    assert make_lock(made).pictures == make_lock(turned).pictures


def test_many_rows_take_no_more_room(make_table, make_lock):
    """The part of a large table stays below its bound."""
    found = make_lock(make_table(40_000)).pictures
    for cloud in [*(one.cloud for one in found.straight), found.spread.cloud, found.pull]:
        assert len(cloud.cells) <= 48 * 32
    assert all(len(one.counts) <= 20 for one in found.histograms)
    assert len(found.normal) == 61


def test_the_part_is_read_back_as_it_was_written(lock):
    """And the same lock without it, as earlier versions wrote it, is still one."""
    sealed = sealed_lock(lock)
    assert lock_from_text(lock_text(sealed), "a.lock.yaml") == sealed
    older = sealed_lock(lock.model_copy(update={"pictures": None}))
    assert "\npictures:" not in lock_text(older)
    assert lock_from_text(lock_text(older), "a.lock.yaml").pictures is None


def test_a_share_safe_copy_has_no_pictures(lock):
    """Cells of one row are near a row."""
    assert "pictures" not in share_safe(sealed_lock(lock))


def test_without_an_answer_only_columns_are_shown(make_table, make_lock):
    """The mean as the answer has no straightness, spread or pull."""
    made = make_table()
    made["use"] = np.random.default_rng(0).normal(size=len(made)).round(3)
    found = make_lock(made)
    assert found.status == "mean_only"
    data = found.pictures
    assert data.histograms
    assert (data.straight, data.spread, data.normal, data.pull) == ((), None, (), None)


def test_an_exact_fit_has_no_residuals_to_show(make_table, make_lock):
    """They are rounding only."""
    made = make_table()
    made["use"] = 2.0 * made["heat"] + 1.0
    data = make_lock(made[["heat", "use"]]).pictures
    assert (data.straight, data.spread, data.normal, data.pull) == ((), None, (), None)

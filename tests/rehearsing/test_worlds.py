"""The worlds: what is shuffled, drawn or held out, and that each replicate is its own."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from beforehand.faults import DataError
from beforehand.plan import plan_from_mapping
from beforehand.rehearsing.hold_out import HoldOutWorld, held_out_of, hold_out_world
from beforehand.rehearsing.noise import noise_world
from beforehand.rehearsing.resample import BOOTSTRAP, HALF_SAMPLES, SampleWorld
from beforehand.rehearsing.rows import half, sample_with_replacement
from beforehand.rehearsing.scramble import scrambled_table
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.trials import STATUSES, Trials
from beforehand.running import run_steps
from beforehand.table import table_from_frame

ADOPTED = STATUSES.index("adopted")


def looms(n: int = 60, seed: int = 5) -> pd.DataFrame:
    """Invented: breaks of thread on looms, by tension, humidity and weaver."""
    rng = np.random.default_rng(seed)
    frame = pd.DataFrame({"tension": rng.normal(30, 4, n), "humidity": rng.normal(55, 8, n)})
    frame["weaver"] = rng.choice(["ann", "bo", "cy"], n)
    frame["hall"] = [f"h{at % 6}" for at in range(n)]
    frame["day"] = np.arange(n)
    frame["breaks"] = 2 + 0.4 * frame["tension"] + rng.normal(0, 2, n)
    return frame


def plan(**changes):
    """Tension and two that may be noise."""
    mapping = {
        "language": 1, "title": "Looms", "question": "What goes with breaks?", "data": {"file": "looms.csv"},
        "outcome": {"column": "breaks"},
        "predictors": [
            {"column": "tension"},
            {"column": "humidity"},
            {"column": "weaver", "kind": "category", "levels": ["ann", "bo", "cy"]},
        ],
    }  # fmt: skip
    return plan_from_mapping(mapping | changes)


def stage_of(made, frame) -> Stage:
    """The stage of a plan on a frame."""
    return Stage.of(made, table_from_frame(made, frame))


def same(one: Trials, other: Trials, places: slice) -> None:
    """Some replicates of one, and all of the other."""
    np.testing.assert_array_equal(one.adopted[places], other.adopted)
    np.testing.assert_allclose(one.r_squared[places], other.r_squared, rtol=1e-9)


def test_noise_holds_the_outcomes_and_shuffles_their_rows():
    """Every replicate has the very outcomes of the table, and another order."""
    stage = stage_of(plan(), looms())
    world = noise_world(stage, 3)
    np.testing.assert_array_equal(world.kept, 0.0)
    outcome = stage.setting.source.raw("breaks")
    shuffled = generator(3, "noise", 4).permutation(world.shuffled)
    np.testing.assert_array_equal(np.sort(shuffled), np.sort(outcome))
    assert (shuffled != outcome).any()


def test_noise_leaves_what_a_held_predictor_explains():
    """Freedman & Lane (1983): only the residuals of the model of held predictors are shuffled."""
    keep = [{"predictor": "tension", "rule": "always", "because": "it pulls"}]
    stage = stage_of(plan(keep=keep), looms())
    world = noise_world(stage, 3)
    source = stage.setting.source
    design = np.column_stack([np.ones(60), source.raw("tension")])
    fitted = design @ np.linalg.lstsq(design, source.raw("breaks"), rcond=None)[0]
    np.testing.assert_allclose(world.kept, fitted, rtol=1e-10)
    np.testing.assert_allclose(world.kept + world.shuffled, source.raw("breaks"), rtol=1e-12)


@pytest.mark.parametrize("steps", [None, ["missing_data", "selection"]])
@pytest.mark.parametrize("name", ["noise", HALF_SAMPLES, BOOTSTRAP])
def test_a_replicate_is_the_same_in_any_block(name, steps):
    """Replicates 7 to 12 are what they are within 0 to 20."""
    made = plan() if steps is None else plan(steps=steps)
    stage = stage_of(made, looms())
    world = noise_world(stage, 3) if name == "noise" else SampleWorld(name=name, stage=stage, seen=(), seed=3)
    same(world.trials(0, 20), world.trials(7, 12), slice(7, 12))


@pytest.mark.parametrize("name", [HALF_SAMPLES, BOOTSTRAP])
def test_samples_side_by_side_are_the_samples_one_by_one(name):
    """Weights and tables are the same draw, and so is what the plan comes to."""
    stage = stage_of(plan(steps=["selection"]), looms())
    world = SampleWorld(name=name, stage=stage, seen=(), seed=11)
    assert world.side_by_side
    together, alone = world.trials(0, 15), world._one_by_one(range(15))
    for field in ("status", "adopted", "present", "rows"):
        np.testing.assert_array_equal(getattr(together, field), getattr(alone, field), err_msg=field)
    fields = ["estimates", "errors", "intercept", "r_squared"]
    for field in fields + (["elsewhere", "slope"] if name == BOOTSTRAP else []):
        one, other = getattr(together, field), getattr(alone, field)
        np.testing.assert_allclose(one, other, rtol=1e-8, atol=1e-10, err_msg=field)


def test_a_sample_is_a_run_on_its_own_table():
    """What a replicate came to is what the plan comes to on that table."""
    made = plan()
    stage = stage_of(made, looms())
    world = SampleWorld(name=HALF_SAMPLES, stage=stage, seen=(), seed=2)
    trials = world.trials(0, 6)
    for replicate in range(6):
        trail = run_steps(made, world.table(replicate))
        assert STATUSES[trials.status[replicate]] == trail.status
        assert trail.final is not None
        if trail.status == "adopted":
            assert trials.r_squared[replicate] == pytest.approx(trail.final.fit.r_squared, rel=1e-9)


def test_halves_are_half_and_draws_are_whole():
    """30 of 60 different rows; 60 rows of which some come twice."""
    made = plan()
    table = table_from_frame(made, looms())
    rows = half(made, table, generator(1, HALF_SAMPLES, 0))
    assert len(rows) == 30
    assert len(set(rows.tolist())) == 30
    drawn = sample_with_replacement(made, table, generator(1, BOOTSTRAP, 0))
    assert drawn.n_rows == 60
    assert len(set(drawn.labels.tolist())) < 60


def test_clusters_are_drawn_whole():
    """Six halls are drawn, and a hall that comes twice counts as two."""
    made = plan(errors={"cluster_by": "hall"})
    table = table_from_frame(made, looms())
    drawn = sample_with_replacement(made, table, generator(4, BOOTSTRAP, 0))
    assert drawn.n_rows == 60
    codes = drawn.columns["hall"].values
    assert len(np.unique(codes)) == 6
    for code in np.unique(codes):
        assert len(set(drawn.labels[codes == code].tolist())) == 10
    rows = half(made, table, generator(4, HALF_SAMPLES, 0))
    hall = table.columns["hall"].values
    assert len(rows) == 30
    assert len(np.unique(hall[rows])) == 3


def test_copies_of_a_row_do_not_follow_each_other_in_time():
    """A check of independence would find copies, not dependence."""
    made = plan(assumptions={"independence": {"in_order_of": "day"}})
    table = table_from_frame(made, looms())
    drawn = sample_with_replacement(made, table, generator(4, BOOTSTRAP, 0))
    assert len(np.unique(drawn.columns["day"].values)) == 60


def test_folds_hold_out_every_row_once():
    """Ten folds of six rows, another division in each repeat."""
    world = hold_out_world(stage_of(plan(), looms()), 3)
    assert world.folds == 10
    first = np.array([world._held_out(0, fold) for fold in range(10)])
    np.testing.assert_array_equal(first.sum(axis=0), 1)
    np.testing.assert_array_equal(first.sum(axis=1), 6)
    assert (first[0] != world._held_out(1, 0)).any()


def test_hold_out_of_a_plan_that_takes_nothing_out_is_leave_one_out_by_hand():
    """60 folds of one row each: the sum of squared errors is PRESS (Allen 1974)."""
    made = plan(steps=[], predictors=[{"column": "tension"}], rehearsal={"folds": 60})
    stage = stage_of(made, looms())
    world = hold_out_world(stage, 3)
    held = held_out_of(world, world.trials(0, 60))
    source = stage.setting.source
    design = np.column_stack([np.ones(60), source.raw("tension")])
    hat = design @ np.linalg.solve(design.T @ design, design.T)
    y = source.raw("breaks")
    residual = y - hat @ y
    assert held.squared.sum() == pytest.approx(float((residual / (1 - hat.diagonal())) ** 2 @ np.ones(60)))
    assert held.squared_mean_model.sum() == pytest.approx(
        float(((y - y.mean()) * 60 / 59) ** 2 @ np.ones(60))
    )


def test_groups_are_left_out_one_at_a_time():
    """One fold a hall; once, since nothing is drawn."""
    world = hold_out_world(stage_of(plan(rehearsal={"leave_out": "hall"}), looms()), 3)
    assert isinstance(world, HoldOutWorld)
    assert world.groups == ("h0", "h1", "h2", "h3", "h4", "h5")
    assert world.repeats(2000) == 1
    held = held_out_of(world, world.trials(0, 6))
    np.testing.assert_array_equal(held.rows, 10)


def test_a_level_that_was_not_seen_is_not_predicted():
    """A weaver who is in one fold only has no coefficient; her rows are counted, not guessed."""
    frame = looms()
    frame["weaver"] = np.where(np.arange(60) == 17, "cy", np.where(np.arange(60) % 2, "ann", "bo"))
    frame["breaks"] += 6 * (frame["weaver"] == "bo")
    world = hold_out_world(stage_of(plan(steps=[]), frame), 3)
    held = held_out_of(world, world.trials(0, 10))
    assert held.not_predicted.sum() == 1
    assert held.rows.sum() == 59


def test_missing_cells_of_held_out_rows_are_filled_as_the_others_teach():
    """With a fill every row is predicted; without one a row with a gap is not."""
    frame = looms()
    frame.loc[[3, 20, 41], "humidity"] = np.nan
    filled = plan(steps=["missing_data"], missing_data={"fill": {"humidity": "median"}})
    left = plan(steps=["missing_data"])
    for made, predicted in ((filled, 60), (left, 57)):
        world = hold_out_world(stage_of(made, frame), 3)
        assert held_out_of(world, world.trials(0, 10)).rows.sum() == predicted


def test_a_scrambled_table_has_the_same_outcomes_and_the_same_predictors():
    """Rows without an outcome stay without one."""
    frame = looms()
    frame.loc[[1, 2], "breaks"] = np.nan
    made = plan()
    table = table_from_frame(made, frame)
    shuffled = scrambled_table(table, made, 9)
    before, after = table.columns["breaks"].values, shuffled.columns["breaks"].values
    np.testing.assert_array_equal(np.isnan(before), np.isnan(after))
    np.testing.assert_array_equal(np.sort(before), np.sort(after))
    assert (before[~np.isnan(before)] != after[~np.isnan(after)]).any()
    for name in ("tension", "humidity", "weaver"):
        np.testing.assert_array_equal(table.columns[name].values, shuffled.columns[name].values)


def test_a_replicate_that_cannot_be_run_is_counted():
    """Halves of eight rows are too few for a model of five coefficients: no fit, and it shows."""
    frame = looms(8, seed=2)
    stage = stage_of(plan(), frame)
    trials = SampleWorld(name=HALF_SAMPLES, stage=stage, seen=(), seed=2).trials(0, 10)
    assert trials.count == 10
    assert (trials.status == STATUSES.index("no_fit")).any()
    assert not trials.adopted[trials.status != ADOPTED].any()


def test_what_a_rule_keeps_is_not_found():
    """Of a group that may not be empty one stands always, and counts as adopted only where it shows."""
    keep = [{"at_least_one_of": ["humidity", "weaver"], "because": "the air or the hand"}]
    made = plan(keep=keep, weak_model={"with_theory": "try_selection"}, steps=["selection"])
    stage = stage_of(made, looms())
    trials = noise_world(stage, 1).trials(0, 300)
    pair = [stage.subjects.names.index(name) for name in ("humidity", "weaver")]
    assert trials.present[:, pair].any(axis=1).all()
    assert trials.adopted[:, pair].any(axis=1).mean() < 0.2


def test_noise_without_an_intercept_has_no_mean_to_be_picked_up():
    """Shuffled outcomes of mean 400 would go with any predictor of one sign."""
    frame = looms()
    frame["breaks"] += 400.0
    made = plan(
        intercept=False, steps=["selection"], predictors=[{"column": "tension"}, {"column": "humidity"}]
    )
    trials = noise_world(stage_of(made, frame), 1).trials(0, 40)
    assert trials.adopted.any(axis=1).mean() < 0.25


def test_parts_of_a_product_that_is_always_kept_are_held():
    """They may not leave either, so they are no finds."""
    keep = [{"predictor": ["tension", "humidity"], "rule": "always", "because": "they act together"}]
    stage = stage_of(plan(products=[["tension", "humidity"]], keep=keep), looms())
    held = dict(zip(stage.subjects.names, stage.subjects.held, strict=True))
    assert held == {"tension": True, "humidity": True, "weaver": False, "tension × humidity": True}


def test_groups_are_counted_and_not_named_where_labels_are_hashed():
    """A group may be a person; and one group alone cannot be left out."""
    data = {"file": "looms.csv", "labels_in_lock": "hashed"}
    world = hold_out_world(stage_of(plan(rehearsal={"leave_out": "hall"}, data=data), looms()), 3)
    assert world.groups == ("1", "2", "3", "4", "5", "6")
    frame = looms()
    frame["hall"] = "h1"
    with pytest.raises(DataError, match="one group"):
        hold_out_world(stage_of(plan(rehearsal={"leave_out": "hall"}), frame), 3)

"""The expected world has the effects that the plan expects, and no other."""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from beforehand.faults import PlanError
from beforehand.plan import Plan, plan_from_mapping
from beforehand.rehearsing.expected import (
    DrawnWorld,
    ExpectedWorld,
    base_columns,
    drawn_worlds,
    expected_world,
    true_slopes,
)
from beforehand.rehearsing.trials import Subjects
from beforehand.table import Table, table_from_frame

SUBJECTS = Subjects(
    names=("flour", "hours", "oven"), held=(False,) * 3,
    columns=("flour", "hours", "oven = deck", "oven = coal"), owners=(0, 1, 2, 2),
)  # fmt: skip
SD = 2.0


def bakery(**blocks: Any) -> Plan:
    """A plan about loaves."""
    return plan_from_mapping(
        {
            "language": 1,
            "title": "Loaves",
            "question": "What makes them rise?",
            "data": {"file": "loaves.csv"},
            "outcome": {"column": "rise"},
            "predictors": [
                {"column": "flour"},
                {"column": "hours"},
                {"column": "oven", "kind": "category", "levels": ["gas", "deck", "coal"]},
            ],
            "expects": {"residual_sd": SD, "slopes": {"flour": 1.5, "oven": {"coal": -3}}},
            **blocks,
        }
    )


def loaves(rows: int = 120) -> pd.DataFrame:
    """Invented loaves."""
    rng = np.random.default_rng(5)
    return pd.DataFrame(
        {
            "rise": rng.normal(40.0, 9.0, rows),
            "flour": rng.normal(10.0, 2.0, rows),
            "hours": rng.uniform(1.0, 9.0, rows),
            "oven": rng.choice(["gas", "deck", "coal"], rows),
            "day": [f"d{number:04d}" for number in rng.permutation(rows)],
            "mill": rng.choice(["a", "b", "c", "d"], rows),
        }
    )


def design_of(table: Table) -> np.ndarray[Any, Any]:
    """Intercept, flour, hours, deck, coal."""
    oven = table.columns["oven"].values
    columns = [table.columns["flour"].values, table.columns["hours"].values, oven == 1, oven == 2]
    return sm.add_constant(np.column_stack(columns).astype(float))


class StandIn:
    """A stage that is not asked for anything."""


def world_of(plan: Plan, table: Table, seed: int = 3) -> ExpectedWorld:
    """The world on the rows at hand."""
    return expected_world(plan, table, StandIn(), seed)  # type: ignore[arg-type]


def test_true_slopes_name_every_column_but_the_baseline():
    """In plan order; what is not named has none."""
    truth = true_slopes(bakery())
    assert list(truth.items()) == [
        ("flour", 1.5), ("hours", 0.0), ("oven = deck", 0.0), ("oven = coal", -3.0)
    ]  # fmt: skip


def test_outcomes_are_truth_and_noise():
    """The mean of many is the truth, the spread about it the declared one."""
    plan = bakery()
    frame = loaves()
    table = table_from_frame(plan, frame)
    outcomes = world_of(plan, table).outcomes(0, 4000)
    assert outcomes.shape == (4000, 120)
    flour = table.columns["flour"].values
    coal = (table.columns["oven"].values == 2).astype(float)
    truth = frame["rise"].mean() + 1.5 * (flour - flour.mean()) - 3.0 * (coal - coal.mean())
    np.testing.assert_allclose(outcomes.mean(axis=0), truth, atol=5 * SD / 4000**0.5)
    assert abs((outcomes - truth).std() / SD - 1.0) < 4 / (2 * outcomes.size) ** 0.5
    np.testing.assert_allclose(world_of(plan, table).truth, truth, rtol=1e-12)


def test_least_squares_finds_the_declared_slopes_again():
    """Unbiased: the mean of many fits, within four of its standard errors."""
    plan = bakery()
    table = table_from_frame(plan, loaves())
    fits = np.array(
        [sm.OLS(y, design_of(table)).fit().params for y in world_of(plan, table).outcomes(0, 800)]
    )
    errors = fits.std(axis=0, ddof=1) / len(fits) ** 0.5
    np.testing.assert_array_less(np.abs(fits.mean(axis=0)[1:] - [1.5, 0.0, 0.0, -3.0]), 4 * errors[1:])


def test_a_replicate_is_the_same_in_whatever_block():
    """Each has a stream of its own."""
    plan = bakery()
    world = world_of(plan, table_from_frame(plan, loaves()))
    whole = world.outcomes(0, 20)
    assert np.concatenate([world.outcomes(0, 7), world.outcomes(7, 20)]).tobytes() == whole.tobytes()
    other = world_of(plan, table_from_frame(plan, loaves()), seed=4).outcomes(0, 20)
    assert (other != whole).all()


def test_filled_cells_count_as_filled_and_incomplete_rows_have_left():
    """The rows are those on which a run stands."""
    plan = bakery(missing_data={"fill": {"flour": "mean"}})
    frame = loaves()
    frame.loc[[3, 4], "flour"] = np.nan
    frame.loc[[9], "hours"] = np.nan
    frame.loc[[11], "rise"] = np.nan
    table = table_from_frame(plan, frame)
    columns = base_columns(plan, table)
    assert len(columns["rise"].values) == 118
    assert not np.isnan(columns["flour"].values).any()
    assert world_of(plan, table).outcomes(0, 2).shape == (2, 118)


def test_a_predictor_that_left_for_its_gaps_has_its_effect_where_it_was_seen():
    """A missing cell counts as the mean; nothing is NaN."""
    plan = bakery()
    frame = loaves()
    frame.loc[:80, "flour"] = np.nan
    world = world_of(plan, table_from_frame(plan, frame))
    assert len(world.truth) == 120
    assert np.isfinite(world.truth).all()


def test_without_an_intercept_the_truth_goes_through_the_origin():
    """Slope times value, and nothing added."""
    plan = bakery(intercept=False)
    table = table_from_frame(plan, loaves())
    flour, coal = table.columns["flour"].values, table.columns["oven"].values == 2
    np.testing.assert_allclose(world_of(plan, table).truth, 1.5 * flour - 3.0 * coal, rtol=1e-12)


# ---- rows drawn anew ----


def drawn(plan: Plan, frame: pd.DataFrame | None, rows: int, seed: int = 3) -> DrawnWorld:
    """The world of so many rows."""
    table = None if frame is None else table_from_frame(plan, frame)
    (world,) = drawn_worlds(plan, table, [rows], SUBJECTS, seed)
    return world


def test_rows_are_drawn_whole_from_the_table():
    """Every drawn row is one of the table's, in all its predictors."""
    frame = loaves()
    world = drawn(bakery(), frame, 300)
    table = world.table(0)
    oven = np.array(["gas", "deck", "coal"])[table.columns["oven"].values]
    found = set(zip(table.columns["flour"].values, table.columns["hours"].values, oven, strict=True))
    assert table.n_rows == 300
    assert found < set(zip(frame["flour"], frame["hours"], frame["oven"], strict=True))
    assert 90 < len(found) < 120


def test_least_squares_on_drawn_rows_finds_the_declared_slopes_again():
    """With a table and without one."""
    shares = {"gas": 0.5, "deck": 0.25, "coal": 0.25}
    declared = {"flour": {"mean": 10, "sd": 2}, "hours": {"mean": 5, "sd": 2}, "oven": {"shares": shares}}
    expects = {"residual_sd": SD, "slopes": {"flour": 1.5, "oven": {"coal": -3}}, "predictors": declared}
    for world in (drawn(bakery(), loaves(), 80), drawn(bakery(expects=expects), None, 80)):
        tables = [world.table(replicate) for replicate in range(600)]
        fits = np.array(
            [sm.OLS(table.columns["rise"].values, design_of(table)).fit().params for table in tables]
        )
        errors = fits.std(axis=0, ddof=1) / len(fits) ** 0.5
        np.testing.assert_array_less(np.abs(fits.mean(axis=0)[1:] - [1.5, 0.0, 0.0, -3.0]), 4 * errors[1:])


def test_a_number_of_rows_has_the_same_tables_in_any_grid():
    """The grid is no part of the random numbers; each number of rows has its own."""
    plan = bakery()
    table = table_from_frame(plan, loaves())
    short = drawn_worlds(plan, table, [100], SUBJECTS, 3)
    long = drawn_worlds(plan, table, [50, 100, 200], SUBJECTS, 3)
    assert [world.name for world in long] == ["expected_50", "expected_100", "expected_200"]
    one, same, other = (world.table(4).columns["rise"].values for world in (short[0], long[1], long[0]))
    assert one.tobytes() == same.tobytes()
    assert not np.isin(other, one).any()


def test_drawn_rows_follow_each_other_in_the_order_that_the_plan_names():
    """A row drawn twice stands twice, and no two rows have one place."""
    plan = bakery(assumptions={"independence": {"in_order_of": "day"}})
    frame = loaves()
    table = drawn(plan, frame, 200).table(0)
    day_of = dict(zip(frame["flour"], frame["day"], strict=True))
    days = [day_of[value] for value in table.columns["flour"].values]
    assert days == sorted(days)
    assert table.columns["day"].values.tolist() == list(range(200))


def test_clusters_are_drawn_with_their_rows():
    """A cluster names the rows that hang together, also among drawn ones."""
    plan = bakery(errors={"cluster_by": "mill"})
    frame = loaves()
    table = drawn(plan, frame, 200).table(0)
    column = table.columns["mill"]
    mill_of = dict(zip(frame["flour"], frame["mill"], strict=True))
    found = [column.levels[code] for code in column.values]
    assert found == [mill_of[value] for value in table.columns["flour"].values]


def test_a_run_of_the_plan_can_be_made_on_a_drawn_table():
    """The table is one like any other."""
    from beforehand.running import run_steps

    trail = run_steps(bakery(), drawn(bakery(), loaves(), 400).table(0))
    assert trail.status == "adopted"
    assert {"flour", "oven"} <= set(trail.state.working)


def test_worlds_go_to_another_process_whole():
    """Pickled and back, they make the same outcomes."""
    plan = bakery()
    table = table_from_frame(plan, loaves())
    world = ExpectedWorld(
        name="expected",
        stage=None,
        truth=world_of(plan, table).truth,
        residual_sd=SD,
        seed=3,  # type: ignore[arg-type]
    )
    again = pickle.loads(pickle.dumps(world))
    assert again.outcomes(0, 3).tobytes() == world.outcomes(0, 3).tobytes()
    more = drawn(plan, loaves(), 60)
    again = pickle.loads(pickle.dumps(more))
    assert again.table(1).columns["rise"].values.tobytes() == more.table(1).columns["rise"].values.tobytes()


@pytest.mark.parametrize("make", [world_of, lambda plan, table: drawn_worlds(plan, table, [9], SUBJECTS, 1)])
def test_without_expectations_there_is_no_expected_world(make):
    """One clear line."""
    plan = bakery(expects=None)
    with pytest.raises(PlanError) as caught:
        make(plan, table_from_frame(plan, loaves()))
    assert str(caught.value) == (
        "plan: expects: is missing, and the expected world is made of it: give residual_sd and slopes"
    )


def test_without_a_table_everything_must_be_declared(tmp_path: Path):
    """Every predictor that is not is named."""
    with pytest.raises(PlanError) as caught:
        drawn(bakery(), None, 50)
    assert [fault.place for fault in caught.value.faults] == [
        "expects.predictors.flour", "expects.predictors.hours", "expects.predictors.oven"
    ]  # fmt: skip


# ---- the whole way: what the plan comes to in the expected world ----

DECLARED = {
    "flour": {"mean": 10, "sd": 2},
    "hours": {"mean": 5, "sd": 2},
    "oven": {"shares": {"gas": 0.5, "deck": 0.3, "coal": 0.2}},
}


def test_subjects_of_a_plan_without_a_table_are_those_it_declares():
    """Products with their levels too, in the names of a record."""
    plan = bakery(
        products=[["flour", "oven"]],
        keep=[{"predictor": "hours", "rule": "always", "because": "Dough needs them."}],
        expects={"residual_sd": SD, "predictors": DECLARED},
    )
    (world,) = drawn_worlds(plan, None, [60], None, 1)
    assert world.subjects.names == ("flour", "hours", "oven", "flour × oven")
    assert world.subjects.held == (False, True, False, False)
    assert world.subjects.columns == (
        "flour", "hours", "oven = deck", "oven = coal", "flour × oven = deck", "flour × oven = coal"
    )  # fmt: skip
    assert world.subjects.owners == (0, 1, 2, 2, 3, 3)


def test_power_for_one_effect_is_that_of_the_noncentral_t():
    """On the rows at hand, without selection: scipy's noncentral t with the design's own noncentrality."""
    from scipy import stats

    from beforehand.rehearsing.stage import Stage

    plan = bakery(steps=[], expects={"residual_sd": SD, "slopes": {"flour": 0.2}})
    table = table_from_frame(plan, loaves())
    world = expected_world(plan, table, Stage.of(plan, table), 11)
    trials = world.trials(0, 3000)
    design = design_of(table)
    df = len(design) - design.shape[1]
    error = SD * np.linalg.inv(design.T @ design)[1, 1] ** 0.5
    bound = stats.t.ppf(0.975, df)
    power = stats.nct.sf(bound, df, 0.2 / error) + stats.nct.cdf(-bound, df, 0.2 / error)
    assert 0.2 < power < 0.9
    assert abs(trials.significant[:, 0].mean() - power) < 4 * (power * (1 - power) / 3000) ** 0.5
    assert abs(trials.significant[:, 1].mean() - 0.05) < 4 * (0.05 * 0.95 / 3000) ** 0.5


def test_drawn_worlds_are_the_same_on_two_workers():
    """Tables are drawn where they are used."""
    from beforehand.rehearsing.engines import Engine, run_world
    from beforehand.rehearsing.trials import Trials

    plan = bakery(
        expects={"residual_sd": SD, "slopes": {"flour": 1.0, "oven": {"coal": -3}}, "predictors": DECLARED}
    )
    (world,) = drawn_worlds(plan, None, [60], None, 1)
    one = run_world(world, 60, block=10)
    two = run_world(world, 60, block=10, engine=Engine(workers=2))
    for part in Trials.__dataclass_fields__:
        assert getattr(one, part).tobytes() == getattr(two, part).tobytes(), part
    assert one.adopted[:, 0].mean() > 0.9
    assert one.adopted[:, 1].mean() < 0.5


def test_the_world_on_the_rows_at_hand_is_the_same_on_two_workers():
    """The stage goes there whole."""
    from beforehand.rehearsing.engines import Engine, run_world
    from beforehand.rehearsing.stage import Stage
    from beforehand.rehearsing.trials import Trials

    plan = bakery()
    table = table_from_frame(plan, loaves())
    world = expected_world(plan, table, Stage.of(plan, table), 11)
    one = run_world(world, 200)
    two = run_world(world, 200, engine=Engine(workers=2))
    for part in Trials.__dataclass_fields__:
        assert getattr(one, part).tobytes() == getattr(two, part).tobytes(), part

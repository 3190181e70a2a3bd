"""A table in memory is held to the same contract as a file."""

from __future__ import annotations

import datetime as dt

import numpy as np
import pandas as pd
import pytest

from beforehand import DataError, plan_from_mapping
from beforehand.table import read_table, table_from_frame

PLAN = plan_from_mapping(
    {
        "language": 1,
        "title": "Kettles",
        "question": "Does scale slow a kettle?",
        "data": {"file": "kettles.csv", "row_label": "kettle"},
        "outcome": {"column": "minutes"},
        "predictors": [{"column": "scale"}, {"column": "lid", "kind": "category", "levels": ["1", "2"]}],
    }
)


def frame(**columns):
    """A small table, with columns changed."""
    return pd.DataFrame(
        {"kettle": [3, 1, 2], "minutes": [1.0, 2.5, 3.0], "scale": [1, 2, 3], "lid": [1, 2, 1], **columns}
    )


@pytest.mark.parametrize(
    "columns",
    [
        {},
        {"scale": pd.array([1, 2, 3], dtype="Int64")},
        {"scale": pd.array([1, 2, 3], dtype="Float64")},
        {"scale": np.array([1, 2, 3], dtype=np.float32)},
        {"scale": ["1", "2.0", " 3 "]},
        {"scale": pd.Series([1, 2, 3], dtype=object)},
        {"lid": [1.0, 2.0, 1.0]},
        {"lid": pd.Categorical(["1", "2", "1"])},
        {"kettle": ["3", "1", "2"]},
        {"unused": [dt.datetime(2026, 1, 1)] * 3},
    ],
)
def test_the_same_table_whatever_its_types(columns):
    """Integers, floats, texts and pandas' own types of the same values are the same table."""
    assert table_from_frame(PLAN, frame(**columns)).fingerprint == table_from_frame(PLAN, frame()).fingerprint


def test_a_frame_and_its_file_are_the_same_table(tmp_path):
    """What is written to CSV and read again has the same fingerprint."""
    path = tmp_path / "kettles.csv"
    frame(scale=[1 / 3, 2e-7, np.nan]).to_csv(path, index=False)
    again = read_table(PLAN, path)
    assert again.fingerprint == table_from_frame(PLAN, frame(scale=[1 / 3, 2e-7, np.nan])).fingerprint


@pytest.mark.parametrize(
    ("columns", "place", "what"),
    [
        ({"scale": [1, np.inf, 3]}, "scale", "infinite"),
        ({"scale": [1, "two", 3]}, "scale", "'two' is not a number"),
        ({"scale": [1 + 2j, 2, 3]}, "scale", "not a number"),
        ({"kettle": [1, 1, 2]}, "kettle", "twice"),
        ({"kettle": [1, None, 2]}, "kettle", "missing"),
        ({"lid": [1, 7, 2]}, "lid", "'7' is not a declared level"),
    ],
)
def test_faults_of_a_frame(columns, place, what):
    """The same faults as of a file, without a line."""
    with pytest.raises(DataError) as caught:
        table_from_frame(PLAN, frame(**columns))
    fault = caught.value.faults[0]
    assert (fault.file, fault.line, fault.place) == ("table", None, place)
    assert what in fault.what


def test_columns_that_are_not_there_or_twice():
    """A missing column names the nearest; a doubled one is refused."""
    with pytest.raises(DataError, match="scales"):
        table_from_frame(PLAN, frame().rename(columns={"scale": "scales"}))
    doubled = pd.concat([frame(), frame()[["scale"]]], axis=1)
    with pytest.raises(DataError, match="twice"):
        table_from_frame(PLAN, doubled)
    with pytest.raises(DataError, match="no rows"):
        table_from_frame(PLAN, frame().iloc[:0])


def test_the_index_is_not_used():
    """An index of any kind, with repeats, is passed over."""
    odd = frame().set_index(pd.Index(["a", "a", "b"]))
    assert table_from_frame(PLAN, odd).fingerprint == table_from_frame(PLAN, frame()).fingerprint

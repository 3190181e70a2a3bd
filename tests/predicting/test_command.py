"""``predict`` as it is typed, and what it does with tables and locks that are not as they should be."""

from __future__ import annotations

import csv
import io
import json
import os
import random
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

import beforehand
from beforehand.handing import safe_text
from beforehand.lock import Lock, lock_text, sealed_lock
from beforehand.lock.prediction import Prediction
from beforehand.predicting.text import safe_cell

PLAN = """\
language: 1
title: Baking of tiles (invented)
question: What goes with the weight that is lost?
data: {file: tiles.csv, row_label: tile, separator: ";", decimal: ","}
eligibility:
  - {column: batch, is_not: trial, because: Trial batches are baked otherwise.}
outcome: {column: loss, unit: g}
predictors:
  - {column: warmth, unit: °C}
  - {column: glaze, kind: category, levels: [matt, gloss]}
steps: []
"""
HEADER = "tile,prediction,mean_low,mean_high,case_low,case_high,outside"


def table_text(n: int = 40) -> str:
    """Invented tiles."""
    draw = random.Random(20261201)
    lines = ["tile;batch;warmth;glaze;loss"]
    for place in range(n):
        warmth, glaze = round(draw.uniform(20, 40), 1), draw.choice(["matt", "gloss"])
        loss = round(5 + 0.4 * warmth + 2 * (glaze == "gloss") + draw.gauss(0, 1), 2)
        lines.append(f"t{place:02d};daily;{warmth};{glaze};{loss}".replace(".", ","))
    return "\n".join(lines) + "\n"


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the plan, its table and its lock."""
    where = tmp_path_factory.mktemp("tiles")
    (where / "tiles.plan.yaml").write_text(PLAN, encoding="utf-8")
    (where / "tiles.csv").write_text(table_text(), encoding="utf-8")
    beforehand.write_lock(
        beforehand.run(where / "tiles.plan.yaml", register=False).lock, where / "tiles.lock.yaml"
    )
    return where


def call(folder: Path, *args: str) -> subprocess.CompletedProcess[str]:
    """The program in that folder."""
    env = {key: value for key, value in os.environ.items() if key not in ("COLUMNS", "NO_COLOR")}
    env |= {"PYTHONPATH": str(Path(beforehand.__file__).parents[1]), "PYTHONIOENCODING": "utf-8"}
    return subprocess.run(
        [sys.executable, "-m", "beforehand", *args], cwd=folder, env=env, capture_output=True, text=True,
        encoding="utf-8", check=False,
    )  # fmt: skip


def refused(folder: Path, text: str, name: str = "new.csv") -> str:
    """What is said of a table that cannot be used; nothing is written."""
    (folder / name).write_text(text, encoding="utf-8")
    done = call(folder, "predict", "tiles.lock.yaml", name, "-o", "never.csv")
    assert (done.returncode, done.stdout) == (2, "")
    assert "Traceback" not in done.stderr
    assert not (folder / "never.csv").exists()
    return done.stderr


def test_predictions_are_written_in_the_order_of_the_new_rows(folder: Path) -> None:
    """Labels first, then five numbers and the reason; no outcome is needed, other columns are not read."""
    new = "glaze;warmth;batch;tile;note\ngloss;30,5;daily;z9;=1\nmatt;99;trial;a1;\nclay;25;daily;b2;\n"
    (folder / "new.csv").write_text(new, encoding="utf-8")
    done = call(folder, "predict", "tiles.lock.yaml", "new.csv", "-o", "out.csv")
    assert (done.returncode, done.stderr) == (0, "")
    assert "Predicted: 3 cases, out.csv" in done.stdout
    assert "A prediction holds inside the range that the fit has seen" in done.stdout
    text = (folder / "out.csv").read_text(encoding="utf-8")
    assert text.startswith(HEADER + "\n")
    rows = list(csv.DictReader(io.StringIO(text)))
    assert [row["tile"] for row in rows] == ["z9", "a1", "b2"]
    assert rows[0]["outside"] == ""
    low, mean, high = (float(rows[0][name]) for name in ("case_low", "prediction", "case_high"))
    assert low < float(rows[0]["mean_low"]) < mean < float(rows[0]["mean_high"]) < high
    assert rows[1]["outside"].startswith(
        "not in the population: it does not meet 'batch is not trial'; warmth 99 is above the largest seen, "
    )
    assert rows[2]["prediction"] == rows[2]["case_high"] == ""
    assert rows[2]["outside"] == "glaze 'clay' was not seen in the fit"
    again = call(folder, "predict", "tiles.lock.yaml", "new.csv", "-o", "out.csv")
    assert again.returncode == 0


def test_without_an_output_the_table_goes_to_standard_output(folder: Path) -> None:
    """The table alone there, and what to keep in mind beside it."""
    (folder / "new.csv").write_text("tile;batch;warmth;glaze\nx;daily;30;matt\n", encoding="utf-8")
    done = call(folder, "predict", "tiles.lock.yaml", "new.csv")
    assert done.returncode == 0
    assert done.stdout.split("\n")[0] == HEADER
    assert len(done.stdout.strip().split("\n")) == 2
    assert "beyond it nothing is known of the equation" in done.stderr


def test_json_has_the_same_numbers(folder: Path) -> None:
    """For programs, with the equation and the cautions."""
    (folder / "new.csv").write_text("tile;batch;warmth;glaze\nx;daily;30;matt\n", encoding="utf-8")
    found: dict[str, Any] = json.loads(call(folder, "predict", "tiles.lock.yaml", "new.csv", "--json").stdout)
    case = beforehand.predict(folder / "tiles.lock.yaml", folder / "new.csv").cases[0]
    assert found["cases"][0]["prediction"] == case.prediction
    assert found["cases"][0]["outside"] == []
    assert (found["status"], found["level"], found["outcome"]) == ("adopted", 0.95, "loss")
    assert found["equation"].startswith("loss = ")


def test_faults_of_the_new_table_are_told_all_at_once(folder: Path) -> None:
    """Missing columns with the nearest name, text for a number, labels that stand twice."""
    said = refused(folder, "tile;batch;warmt;glaze\nx;daily;30;matt\n")
    assert said == "new.csv:1: warmth: the table has no such column (nearest: 'warmt')\n"
    said = refused(folder, "tile;batch;warmth;glaze\nx;daily;warm;matt\nx;daily;3.5;matt\n")
    assert [line.split(": ")[:2] for line in said.strip().split("\n")] == [
        ["new.csv:2", "warmth"], ["new.csv:3", "warmth"], ["new.csv:3", "tile"],
    ]  # fmt: skip
    assert "(declare data.decimal)" in said


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("tile;batch;warmth;glaze\n", "has a header and no rows"),
        ("tile;batch;warmth;glaze\nx;daily;30\n", "the line has 3 cells and the header 4"),
        ("tile;batch;warmth;glaze\nx;daily;inf;matt\n", "'inf' is infinite"),
        ('tile;batch;warmth;glaze\n"x;daily;30;matt\n', "cannot be read as cells"),
        ("tile,batch,warmth,glaze\nx,daily,30,matt\n", "its header is one cell with the separator ';'"),
    ],
)
def test_hostile_tables_are_refused(folder: Path, text: str, said: str) -> None:
    """One clear line each, exit code 2."""
    assert said in refused(folder, text)


def test_a_table_that_is_not_ours_is_never_replaced(folder: Path) -> None:
    """The new table named as the output stays as it is."""
    (folder / "new.csv").write_text("tile;batch;warmth;glaze\nx;daily;30;matt\n", encoding="utf-8")
    done = call(folder, "predict", "tiles.lock.yaml", "new.csv", "-o", "new.csv")
    assert done.returncode == 2
    assert done.stderr == ("new.csv: is not a table of predictions and is left as it is; name another file\n")
    assert call(folder, "predict", "tiles.lock.yaml", "new.csv", "-o", "no/where.csv").returncode == 2


def test_labels_cannot_become_formulas(folder: Path) -> None:
    """An apostrophe before what a spreadsheet computes; numbers stay numbers."""
    rows = ["=1+1", "+a", "-2", "@x", '"=HYPERLINK(""x"")"', "plain"]
    text = "tile;batch;warmth;glaze\n" + "".join(f"{label};daily;30;matt\n" for label in rows)
    (folder / "new.csv").write_text(text, encoding="utf-8")
    done = call(folder, "predict", "tiles.lock.yaml", "new.csv")
    found = [row["tile"] for row in csv.DictReader(io.StringIO(done.stdout))]
    assert found == ["'=1+1", "'+a", "'-2", "'@x", '\'=HYPERLINK("x")', "plain"]
    assert safe_cell("\t=1") == "'\t=1"
    assert safe_cell(" =1") == "' =1"


def remade(folder: Path, name: str, **changes: Any) -> str:
    """A lock with some parts replaced, on file with its digest."""
    lock = beforehand.read_lock(folder / "tiles.lock.yaml")
    changed = sealed_lock(lock.model_copy(update=changes))
    (folder / name).write_text(lock_text(changed), encoding="utf-8")
    return name


def said_of(folder: Path, lock: str) -> str:
    """What is said of a lock that cannot predict."""
    (folder / "new.csv").write_text("tile;batch;warmth;glaze\nx;daily;30;matt\n", encoding="utf-8")
    done = call(folder, "predict", lock, "new.csv")
    assert (done.returncode, done.stdout) == (2, "")
    return done.stderr


def test_a_lock_of_an_earlier_version_is_refused(folder: Path) -> None:
    """In one line that says what to do."""
    assert said_of(folder, remade(folder, "old.lock.yaml", prediction=None)) == (
        "old.lock.yaml: this lock was written by an earlier version, without what predictions need: "
        "run the plan again\n"
    )


def test_a_stopped_run_is_refused(folder: Path) -> None:
    """Nothing was adopted."""
    assert said_of(folder, remade(folder, "stopped.lock.yaml", status="stopped")) == (
        "stopped.lock.yaml: the run stopped and adopted nothing that could predict\n"
    )


def test_a_lock_that_was_changed_is_refused(folder: Path) -> None:
    """By its digest; and one whose digest was made again, by its shape."""
    text = (folder / "tiles.lock.yaml").read_text(encoding="utf-8")
    (folder / "bad.lock.yaml").write_text(text.replace("df: 37", "df: 38"), encoding="utf-8")
    assert "it was changed after it was written" in said_of(folder, "bad.lock.yaml")
    lock = beforehand.read_lock(folder / "tiles.lock.yaml")
    assert isinstance(lock.prediction, Prediction)
    first = lock.prediction.columns[0].model_copy(update={"inverse_root": (1.0, 2.0)})
    columns = (first, *lock.prediction.columns[1:])
    odd = lock.prediction.model_copy(update={"columns": columns})
    assert said_of(folder, remade(folder, "odd.lock.yaml", prediction=odd)) == (
        "odd.lock.yaml: its part for predictions does not fit together\n"
    )


def test_an_exact_fit_is_refused() -> None:
    """Its residuals are rounding, and no interval comes of them."""
    import pandas as pd

    x = [1.0, 2.0, 3.0, 5.0, 8.0, 9.0]
    plan = beforehand.plan_from_mapping(
        {
            "language": 1, "title": "Exact", "question": "Is y twice x?", "data": {"file": "t.csv"},
            "outcome": {"column": "y"}, "predictors": [{"column": "x"}], "steps": [],
        }
    )  # fmt: skip
    lock = beforehand.run(plan, pd.DataFrame({"x": x, "y": [2 * one for one in x]})).lock
    assert lock.prediction is None
    with pytest.raises(beforehand.LockError, match="its equation fits exactly"):
        beforehand.predict(lock, pd.DataFrame({"x": [4.0]}))


def test_a_share_safe_copy_lacks_the_part(folder: Path) -> None:
    """The largest leverage, the ends of what was seen and the residuals are values of rows."""
    lock: Lock = beforehand.read_lock(folder / "tiles.lock.yaml")
    assert lock.prediction is not None
    text = safe_text(lock)
    for word in ("prediction:", "inverse_root", "largest_leverage", "seen:", "centre"):
        assert word not in text


def test_a_frame_with_the_same_faults(folder: Path) -> None:
    """A DataFrame goes under the same contract."""
    import pandas as pd

    lock = folder / "tiles.lock.yaml"
    frame = pd.DataFrame({"tile": ["a"], "batch": ["daily"], "warmth": ["x"], "glaze": ["matt"]})
    with pytest.raises(beforehand.DataError, match="'x' is not a number"):
        beforehand.predict(lock, frame)
    with pytest.raises(beforehand.DataError, match="no such column"):
        beforehand.predict(lock, frame.drop(columns="glaze"))
    with pytest.raises(beforehand.DataError, match="has no rows"):
        beforehand.predict(lock, frame.iloc[:0])

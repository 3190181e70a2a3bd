"""How long a run takes, and how much memory, beside the libraries that it could be written with.

Run it as ``python tests/benchmarks/speed.py``, or with ``--full`` for a table of a million rows. Every
figure is a ratio measured on the machine at hand, one thread each, and stands beside its goal.

The plain loop is what one would write without this program: ``OLS(y, X).fit()`` and its p-values for
every fit that the run needs, on matrices that stand ready in memory: the fits in its record, and in
(a) the regressions behind the curvature, spread and RESET checks and the variance inflation that its
record holds (shown with and without these). It is timed at a few numbers of columns on the same rows,
and interpolated (on a log-log scale) to each fit. It leaves out no influential row and records nothing.
"""

# ruff: noqa: E402
from __future__ import annotations

import os

# Before numpy is imported, here and in every process that is started: one thread each.
for _variable in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_variable] = "1"

import argparse
import contextlib
import json
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
SRC = ROOT / "src"
READY_PLAN = ROOT / "plans" / "cold-rooms" / "cold-rooms.plan.yaml"

sys.path.insert(0, str(SRC))

# ru_maxrss counts kibibytes on Linux and bytes on macOS.
_RSS_UNIT = 1 if sys.platform == "darwin" else 1024


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One measured ratio beside its goal.

    Attributes
    ----------
    what : str
    ours, other : str
        Figures with their unit.
    ratio, goal : float
        Ours over the other; the goal is an upper limit.
    """

    what: str
    ours: str
    other: str
    ratio: float
    goal: float


def main(arguments: Sequence[str] | None = None) -> int:
    """Measure and print; the exit code is 0 whether or not a goal is met."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--full", action="store_true", help="1,000,000 rows instead of 100,000")
    parser.add_argument("--rows", type=int, help="another number of rows")
    parser.add_argument("--repeats", type=int, default=3, help="runs of which the median counts")
    parser.add_argument("--only", default="abcde", help="which parts to measure, such as ac")
    parser.add_argument("--child", nargs="+", help=argparse.SUPPRESS)
    chosen = parser.parse_args(arguments)
    if chosen.child:
        print(json.dumps(_child(*chosen.child)))
        return 0
    rows = chosen.rows or (1_000_000 if chosen.full else 100_000)
    parts: dict[str, Callable[[], list[Line]]] = {
        "a": lambda: default_run(rows, chosen.repeats),
        "b": lambda: reading(rows, chosen.repeats),
        "c": lambda: many_candidates(chosen.repeats),
        "d": lambda: whole_process(max(5, chosen.repeats)),
        "e": lambda: help_text(max(5, chosen.repeats)),
    }
    print(_machine())
    print(f"Median of {chosen.repeats} runs each (whole processes: of {max(5, chosen.repeats)}).\n")
    print(f"{'':56}{'ours':>12}{'other':>12}{'ratio':>10}{'goal':>8}")
    for part in chosen.only:
        for line in parts[part]():
            met = "met" if line.ratio <= line.goal else "not met"
            print(
                f"{line.what:56}{line.ours:>12}{line.other:>12}"
                f"{_ratio(line.ratio, line.goal):>10}{_ratio(line.goal, line.goal):>8}  {met}",
                flush=True,
            )
    print(
        "\nThe plain loop: statsmodels OLS(y, X).fit() and its p-values, timed on the same rows at a few\n"
        "numbers of columns and interpolated over the fits that the run recorded; in (a), after the\n"
        "plus sign, over the regressions behind its recorded checks too. Memory: largest resident size\n"
        "of a process of its own, above what it held with everything imported; the table that the\n"
        "caller holds is counted in."
    )
    return 0


def _machine() -> str:
    import numpy as np
    import pandas as pd
    import scipy
    import statsmodels

    return (
        f"Python {sys.version.split()[0]}, numpy {np.__version__}, scipy {scipy.__version__}, "
        f"pandas {pd.__version__}, statsmodels {statsmodels.__version__}; one thread."
    )


def _ratio(value: float, goal: float) -> str:
    """A ratio as it is spoken of: a fraction where the goal is one."""
    return f"1/{1 / value:.1f}".removesuffix(".0") if goal < 1 else f"{value:.2f}".removesuffix(".00")


# -- (a) and (c): a run beside a plain loop ---------------------------------------------------


def default_run(rows: int, repeats: int) -> list[Line]:
    """A full default run, and its memory."""
    table, plan = _table(rows, 30), _plan(30)
    ours, fits, behind = _run_time(plan, table, repeats)
    loop, loop_behind = _loop_times(table, (fits, behind), (1, 8, 16, 31, 33), repeats)
    del table
    held = _measured("run", str(rows), "30")
    size = f"{rows:,} rows x 30, {len(fits)} fits"
    return [
        Line(what=f"(a) default run, {size} + {len(behind)}: time", ours=f"{ours:.2f} s",
             other=f"{loop + loop_behind:.1f} s", ratio=ours / (loop + loop_behind), goal=1 / 20),
        Line(what=f"    the same beside its {len(fits)} fits alone", ours=f"{ours:.2f} s",
             other=f"{loop:.1f} s", ratio=ours / loop, goal=1 / 20),
        Line(what="    its memory / the numeric table", ours=_mib(held["peak"]), other=_mib(held["table"]),
             ratio=held["peak"] / held["table"], goal=4.0),
    ]  # fmt: skip


def many_candidates(repeats: int) -> list[Line]:
    """Backward selection among 200 candidates."""
    table, plan = _table(20_000, 200), _plan(200, steps=["selection"])
    ours, fits, _ = _run_time(plan, table, repeats)
    (loop,) = _loop_times(table, (fits,), (2, 68, 135, 201), repeats)
    return [
        Line(what=f"(c) backward selection, 20,000 rows x 200, {len(fits)} fits", ours=f"{ours:.2f} s",
             other=f"{loop:.1f} s", ratio=ours / loop, goal=1 / 50)
    ]  # fmt: skip


def _table(rows: int, columns: int) -> Any:
    """An invented table: ``y`` and predictors of which five have effects; no copy is made of it."""
    import numpy as np
    import pandas as pd

    source = np.random.default_rng(20261201)
    values = np.empty((rows, columns + 1), order="F")
    for column in range(columns):
        values[:, column + 1] = source.standard_normal(rows)
    values[:, 0] = source.standard_normal(rows)
    for column, slope in enumerate((0.8, -0.5, 0.3, 0.2, -0.2)):
        values[:, 0] += slope * values[:, column + 1]
    # Six decimals, as a measured table has them.
    for column in range(columns + 1):
        np.round(values[:, column], 6, out=values[:, column])
    names = ["y", *(f"x{column:03d}" for column in range(1, columns + 1))]
    return pd.DataFrame(values, columns=names, copy=False)


def _plan(columns: int, **changes: Any) -> Any:
    """A plan with every default, but for what is changed."""
    from beforehand import plan_from_mapping

    return plan_from_mapping(
        {
            "language": 1,
            "title": "Invented numbers",
            "question": "How long does it take?",
            "data": {"file": "invented.csv"},
            "outcome": {"column": "y"},
            "predictors": [{"column": f"x{column:03d}"} for column in range(1, columns + 1)],
            **changes,
        }
    )


Fits = list[tuple[int, int]]  # rows and columns of each


def _run_time(plan: Any, table: Any, repeats: int) -> tuple[float, Fits, Fits]:
    """Seconds of a run, the fits that it recorded, and the regressions behind its recorded checks."""
    import beforehand

    beforehand.run(plan, table.iloc[:1000])  # everything imported
    times: list[float] = []
    fits: Fits = []
    behind: Fits = []
    for _ in range(repeats):
        start = time.perf_counter()
        run = beforehand.run(plan, table)
        times.append(time.perf_counter() - start)
        record = run.trail.bench.record
        fits = [(recorded.fit.n, recorded.fit.p) for recorded in record.fits]
        behind = _behind(record)
    return statistics.median(times), fits, behind


def _behind(record: Any) -> Fits:
    """Regressions that a library runs for what stands beside the fits: checks and variance inflation.

    A curvature check is a fit with one column more and a RESET one with two more; a check of equal
    spread is a fit of the squared residuals on its columns; each variance inflation is a fit of one
    predictor on the others. The fits without each flagged row are not counted.
    """
    models = {recorded.id: recorded.fit for recorded in record.fits}
    found: Fits = []
    for recorded in record.checks:
        fit, check = models[recorded.fit], recorded.check
        if check.statistic is None:
            continue
        if check.name == "curvature":
            found.append((fit.n, fit.p + 1))
        elif check.name == "reset":
            found.append((fit.n, fit.p + 2))
        elif check.name in ("breusch_pagan", "white"):
            found.append((fit.n, int(check.df[0]) + 1))
    for one in record.collinearity:
        found += [(one.model.rows.n, one.model.p - 1)] * len(one.inflation)
    return found


def _loop_times(
    table: Any, groups: Sequence[Fits], sampled: Sequence[int], repeats: int
) -> tuple[float, ...]:
    """Seconds of the plain loop over each group of fits."""
    import numpy as np
    import statsmodels.api as sm

    y = np.ascontiguousarray(table["y"].to_numpy())
    whole = sm.add_constant(np.ascontiguousarray(table.to_numpy()[:, 1:]))
    seconds: list[float] = []
    for columns in sampled:
        # The last sample of a full table has its own squares added, as a check would add them.
        more = max(0, columns - whole.shape[1])
        design = np.column_stack([whole[:, :columns], whole[:, 1 : 1 + more] ** 2])
        seconds.append(_median_time(lambda design=design: sm.OLS(y, design).fit().pvalues, repeats))
    found: list[float] = []
    for fits in groups:
        p = np.array([columns for _, columns in fits])
        shares = np.array([n for n, _ in fits]) / len(y)
        each = np.exp(np.interp(np.log(p), np.log(sampled), np.log(seconds)))
        found.append(float((each * shares).sum()))
    return tuple(found)


# -- (b): reading -----------------------------------------------------------------------------


def reading(rows: int, repeats: int) -> list[Line]:
    """Reading the table from a CSV file."""
    import pandas as pd

    from beforehand.table import read_table

    plan = _plan(30)
    with tempfile.TemporaryDirectory() as folder:
        path = str(Path(folder) / "invented.csv")
        _table(rows, 30).to_csv(path, index=False)
        size = Path(path).stat().st_size
        other = _median_time(lambda: pd.read_csv(path), repeats)
        ours = _median_time(lambda: read_table(plan, path), repeats)
        held, held_other = _measured("read", path), _measured("read_csv", path)
    return [
        Line(what=f"(b) reading CSV, {rows:,} rows x 31 ({size / 2**20:.0f} MiB): time", ours=f"{ours:.2f} s",
             other=f"{other:.2f} s", ratio=ours / other, goal=3.0),
        Line(what="    its memory", ours=_mib(held["peak"]), other=_mib(held_other["peak"]),
             ratio=held["peak"] / held_other["peak"], goal=3.0),
    ]  # fmt: skip


# -- (d) and (e): whole processes -------------------------------------------------------------


def whole_process(repeats: int) -> list[Line]:
    """A ready plan from the shell."""
    with tempfile.TemporaryDirectory() as folder:
        lock = str(Path(folder) / "cold-rooms.lock.yaml")
        command = ["-m", "beforehand.cli", "run", str(READY_PLAN), "-o", lock]
        ours, other = _process_times(command, ["-c", "import statsmodels.api, pandas"], repeats)
    return [
        Line(what="(d) ready plan of 400 rows / import statsmodels, pandas", ours=f"{ours:.2f} s",
             other=f"{other:.2f} s", ratio=ours / other, goal=1.6)
    ]  # fmt: skip


def help_text(repeats: int) -> list[Line]:
    """The first thing that anyone asks for."""
    ours, other = _process_times(
        ["-m", "beforehand.cli", "--help"], ["-c", "import typer, pydantic"], repeats
    )
    return [
        Line(what="(e) --help / import typer, pydantic", ours=f"{ours:.2f} s", other=f"{other:.2f} s",
             ratio=ours / other, goal=2.5)
    ]  # fmt: skip


# -- measuring --------------------------------------------------------------------------------


def _median_time(work: Callable[[], Any], repeats: int) -> float:
    times: list[float] = []
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def _process_times(ours: list[str], other: list[str], repeats: int) -> tuple[float, float]:
    """Median seconds of two processes, run in turn so that a busy moment touches both."""
    _process(ours), _process(other)  # compiled files and the disk cache are there
    pairs = [(_process(ours), _process(other)) for _ in range(repeats)]
    return statistics.median(one for one, _ in pairs), statistics.median(two for _, two in pairs)


def _process(command: list[str]) -> float:
    environment = {**os.environ, "PYTHONPATH": str(SRC)}
    start = time.perf_counter()
    subprocess.run([sys.executable, *command], env=environment, check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def _measured(*what: str) -> dict[str, float]:
    """What a process of its own says about its memory."""
    done = subprocess.run(
        [sys.executable, __file__, "--child", *what], check=True, capture_output=True, text=True
    )
    found: dict[str, float] = json.loads(done.stdout.splitlines()[-1])
    return found


def _child(task: str, *arguments: str) -> dict[str, float]:
    """Run one task and give its peak of memory above what the imports hold, in bytes."""
    import pandas as pd

    import beforehand
    from beforehand.table import read_table

    columns = int(arguments[1]) if task == "run" else 30
    small, plan = _table(1000, columns), _plan(columns)
    beforehand.run(plan, small)  # everything imported
    before = _peak()
    size = 0.0
    if task == "run":
        table = _table(int(arguments[0]), columns)
        size = float(table.to_numpy().nbytes)
        with contextlib.redirect_stdout(sys.stderr):
            beforehand.run(plan, table)
    elif task == "read":
        read_table(plan, arguments[0])
    else:
        pd.read_csv(arguments[0])
    return {"peak": float(_peak() - before), "table": size}


def _peak() -> int:
    """Largest resident size of this process so far, in bytes."""
    with contextlib.suppress(OSError):
        # On Linux ru_maxrss starts from what the process that started this one has held.
        for line in Path("/proc/self/status").read_text(encoding="ascii").splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) * 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * _RSS_UNIT


def _mib(size: float) -> str:
    return f"{size / 2**20:,.0f} MiB"


if __name__ == "__main__":
    raise SystemExit(main())

"""How long a rehearsal takes beside the same decisions scripted with a library, and beside bare products.

Run it as ``python tests/benchmarks/rehearsal.py``, with ``--full`` for more replicates of the slow sides,
or with ``--only NAME`` for some parts. Every figure is a ratio measured on the machine at hand, in this
very process and on one thread, and stands beside its goal. Ours is `run_world` whole: random numbers,
blocks, statuses, coefficients and R² of every replicate.
"""

# ruff: noqa: E402
from __future__ import annotations

import argparse
import json
import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable, Iterable, Sequence
from dataclasses import fields
from pathlib import Path
from typing import Any

HERE = Path(__file__).resolve()
SRC = HERE.parents[2] / "src"
sys.path[:0] = [str(SRC), str(HERE.parent)]
# Worker processes find the package too, and have one thread each from the start.
os.environ["PYTHONPATH"] = os.pathsep.join([str(SRC), *filter(None, [os.environ.get("PYTHONPATH")])])
for _variable in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_variable] = "1"

import numpy as np
import pandas as pd
from library_twin import loop, twin
from measuring import Line, both, median_time, mib, ms, peak, timed
from threadpoolctl import threadpool_limits

from beforehand.plan import plan_from_mapping
from beforehand.rehearsing.engines import BLOCK, Engine, run_world
from beforehand.rehearsing.expected import expected_world
from beforehand.rehearsing.noise import noise_world
from beforehand.rehearsing.resample import BOOTSTRAP, HALF_SAMPLES, SampleWorld
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.trials import STATUSES
from beforehand.rehearsing.whole import WIDE_BLOCK, block_of
from beforehand.running import ranks_in_base
from beforehand.table import table_from_frame

SEED = 20261201
COLUMNS = 20
NAMES = [f"x{place:02d}" for place in range(1, COLUMNS + 1)]
SLOPES = {"x01": 0.4, "x02": -0.3, "x03": 0.2, "x04": 0.15, "x05": -0.1}
GATE = "F gate first"
NO_GATE = "always eliminates"

PARTS = ("selection", "large", "products", "steps", "workers", "memory")


def main(arguments: Sequence[str] | None = None) -> int:
    """Measure and print; the exit code is 0 whether or not a goal is met."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--full", action="store_true", help="five times the replicates of the slow sides")
    parser.add_argument("--repeats", type=int, default=3, help="runs of which the median counts")
    parser.add_argument("--only", choices=PARTS, action="append", help="a part to measure; repeatable")
    parser.add_argument("--child", type=int, help=argparse.SUPPRESS)
    chosen = parser.parse_args(arguments)
    if chosen.child:
        print(json.dumps(_memory_of(chosen.child)))
        return 0
    more = 5 if chosen.full else 1
    parts: dict[str, Callable[[], Iterable[Line]]] = {
        "selection": lambda: selection_only(1_000, 2_000, 20 * more, chosen.repeats),
        "large": lambda: selection_only(10_000, 2_000, 20 * more, chosen.repeats),
        "products": lambda: bare_products(10_000, 1_000 * more, chosen.repeats),
        "steps": lambda: every_step(400, 2 * more, chosen.repeats),
        "workers": lambda: two_workers(800 * more, chosen.repeats),
        "memory": lambda: memory(),
    }
    print(_machine())
    print(
        f"Medians of {chosen.repeats} runs, in ms of processor time a replicate where nothing else is said.\n"
    )
    print(f"{'':70}{'ours':>12}{'other':>12}{'ratio':>9}{'goal':>8}")
    with threadpool_limits(limits=1):
        for part in chosen.only or PARTS:
            for line in parts[part]():
                print(line.told(), flush=True)
    print(
        "\nPlain loop: statsmodels OLS refitted for each elimination step on arrays that stand ready. Twin:\n"
        "the same decisions by statsmodels calls; its externally studentized residuals refit the model\n"
        "once a row, so that the ratio is given with their closed form too. Both are timed on a few of\n"
        "the replicates that ours runs. Memory: growth of the largest resident size of a process."
    )
    return 0


def _machine() -> str:
    import scipy
    import statsmodels

    return (
        f"Python {sys.version.split()[0]}, numpy {np.__version__}, scipy {scipy.__version__}, pandas "
        f"{pd.__version__}, statsmodels {statsmodels.__version__}; {os.cpu_count()} cores, one thread each."
    )


# -- what is rehearsed ------------------------------------------------------------------------


def _frame(rows: int, missing: int = 0) -> pd.DataFrame:
    """An invented table: twenty predictors, five of them with effects, and the order of the rows."""
    rng = np.random.default_rng(SEED)
    frame = pd.DataFrame(rng.normal(size=(rows + missing, COLUMNS)), columns=NAMES)
    frame["y"] = frame[list(SLOPES)] @ list(SLOPES.values()) + rng.normal(size=len(frame))
    frame.loc[frame.index[:missing], NAMES[-1]] = np.nan
    frame["t"] = np.arange(float(len(frame)))
    return frame


def _plan(**changes: Any) -> Any:
    return plan_from_mapping(
        {
            "language": 1, "title": "Invented numbers", "question": "How long does it take?",
            "data": {"file": "invented.csv"}, "outcome": {"column": "y"},
            "predictors": [{"column": name} for name in NAMES],
            "expects": {"residual_sd": 1.0, "slopes": SLOPES}, **changes,
        }
    )  # fmt: skip


def _selecting(gate: bool) -> Any:
    """A plan that selects only; without the gate a keep rule that prevents nothing lets it go on."""
    if gate:
        return _plan(steps=["selection"])
    keep = [{"predictor": "x01", "rule": {"unless_p_above": 0.05}, "because": "it prevents nothing"}]
    return _plan(steps=["selection"], keep=keep, weak_model={"with_theory": "try_selection"})


def _stage(plan: Any, frame: pd.DataFrame) -> Stage:
    return Stage.of(plan, table_from_frame(plan, frame))


def _raw(stage: Stage) -> tuple[Any, Any]:
    """Outcome and design of the base, ready for the loop."""
    source = stage.setting.source
    columns = [source.raw(name) for name in NAMES]
    return source.raw("y"), np.column_stack([np.ones(stage.n_rows), *columns])


# -- parts ------------------------------------------------------------------------------------


def selection_only(rows: int, replicates: int, sampled: int, repeats: int) -> Iterable[Line]:
    """Selection only, in noise and on samples, beside the plain loop."""
    frame = _frame(rows)
    for gate in (False, True):
        stage = _stage(_selecting(gate), frame)
        y, design = _raw(stage)
        n = stage.n_rows

        def noise(replicate: int, y: Any = y, design: Any = design, gate: bool = gate) -> Any:
            return loop(np.random.default_rng(replicate).permutation(y), design, gate=gate)

        def halves(replicate: int, y: Any = y, design: Any = design, gate: bool = gate, n: int = n) -> Any:
            picked = np.random.default_rng(replicate).permutation(n)[: n // 2]
            return loop(y[picked], design[picked], gate=gate)

        def again(replicate: int, y: Any = y, design: Any = design, gate: bool = gate, n: int = n) -> Any:
            picked = np.random.default_rng(replicate).integers(0, n, n)
            return loop(y[picked], design[picked], gate=gate, whole=(y, design))

        worlds = {
            "noise": (noise_world(stage, SEED), noise),
            "half-samples": (SampleWorld(name=HALF_SAMPLES, stage=stage, seen=(), seed=SEED), halves),
            "with replacement": (SampleWorld(name=BOOTSTRAP, stage=stage, seen=(), seed=SEED), again),
        }
        for name, (world, other) in worlds.items():
            fits = statistics.mean(other(replicate)[1] for replicate in range(sampled))
            ours, plain = both(
                lambda world=world: run_world(world, replicates, block=block_of(rows, wide=True)), replicates,
                lambda other=other: [other(one) for one in range(sampled)], sampled, repeats,
            )  # fmt: skip
            what = f"{name}, {rows:,} x {COLUMNS}, {GATE if gate else NO_GATE}, loop of {fits:.1f} fits"
            yield Line(what=what, ours=ms(ours), other=ms(plain), ratio=plain / ours, goal=150)


def bare_products(rows: int, replicates: int, repeats: int) -> Iterable[Line]:
    """Selection only beside the matrix product that its cross-products need, and the draws alone."""
    stage = _stage(_selecting(gate=False), _frame(rows))
    y, design = _raw(stage)
    n, rng = stage.n_rows, np.random.default_rng(SEED)
    columns = np.asfortranarray(design[:, 1:])
    many = rng.normal(size=(WIDE_BLOCK, n))
    upper = np.triu_indices(COLUMNS + 1)
    part = np.column_stack([columns, y])
    # Sums, and products, of the columns and the outcome.
    wide = np.column_stack([part, part[:, upper[0]] * part[:, upper[1]]])
    weights = rng.poisson(1.0, size=(WIDE_BLOCK, n)).astype(float)
    blocks = replicates // WIDE_BLOCK

    def draw_noise() -> None:
        for replicate in range(replicates):
            generator(SEED, "noise", replicate).permutation(y)

    def draw_halves() -> None:
        for replicate in range(replicates):
            generator(SEED, HALF_SAMPLES, replicate).permutation(n)

    def draw_again() -> None:
        for replicate in range(replicates):
            generator(SEED, BOOTSTRAP, replicate).integers(0, n, n)

    cases: list[tuple[str, Any, Callable[[], Any], Callable[[], Any]]] = [
        ("noise", noise_world(stage, SEED), lambda: many @ columns, draw_noise),
        ("half-samples", SampleWorld(name=HALF_SAMPLES, stage=stage, seen=(), seed=SEED),
         lambda: weights @ wide, draw_halves),
        ("with replacement", SampleWorld(name=BOOTSTRAP, stage=stage, seen=(), seed=SEED),
         lambda: weights @ wide, draw_again),
    ]  # fmt: skip
    for name, world, product, draw in cases:
        ours, bare = both(
            lambda world=world: run_world(world, replicates, block=block_of(rows, wide=True)), replicates,
            lambda product=product: [product() for _ in range(blocks)], replicates, repeats,
        )  # fmt: skip
        drawn = median_time(draw, repeats) / replicates
        what = f"{name}, {rows:,} x {COLUMNS}, over its bare product"
        yield Line(
            what=what, ours=ms(ours), other=ms(bare), ratio=ours / bare, goal=3, at_most=True
        )  # fmt: skip
        yield Line(what="    the draws alone, as a share of ours", ours=ms(ours), other=ms(drawn),
                   ratio=drawn / ours)  # fmt: skip
        yield Line(what="    product and draws, over these", ours=ms(ours), other=ms(bare + drawn),
                   ratio=ours / (bare + drawn))  # fmt: skip


def every_step(replicates: int, sampled: int, repeats: int) -> Iterable[Line]:
    """Every step on, with default rules, beside the twin."""
    plan = _plan(assumptions={"independence": {"test": "breusch_godfrey", "in_order_of": "t"}})
    frame = _frame(1_000, missing=10)
    table = table_from_frame(plan, frame)
    stage = Stage.of(plan, table)
    noise, expected = noise_world(stage, SEED), expected_world(plan, table, stage, SEED)
    outcomes = {
        "noise": lambda replicate: generator(SEED, "noise", replicate).permutation(noise.shuffled),
        "expected effects": lambda replicate: expected.outcomes(replicate, replicate + 1)[0],
    }
    # The base is in an order of its own.
    order = np.argsort(ranks_in_base(table, "t", stage.setting.base))
    complete = np.flatnonzero(frame.notna().all(axis=1))
    for name, world in (("noise", noise), ("expected effects", expected)):
        # The first replicates, in the order of the file, with its incomplete rows.
        frames = []
        for replicate in range(sampled):
            own = frame.copy()
            own.loc[complete, "y"] = outcomes[name](replicate)[order]
            frames.append(own)
        answers = [twin(own, closed_form=True) for own in frames]
        trials = world.trials(0, sampled)
        same = sum(
            answer.status == STATUSES[trials.status[at]]
            and answer.names == {NAMES[k] for k in np.flatnonzero(trials.adopted[at])}
            and answer.rows == trials.rows[at]
            for at, answer in enumerate(answers)
        )
        fits = statistics.mean(answer.fits for answer in answers)
        for closed in (False, True):
            ours, other = both(
                lambda world=world: run_world(world, replicates), replicates,
                lambda closed=closed, frames=frames: [twin(own, closed_form=closed) for own in frames],
                sampled, repeats,
            )  # fmt: skip
            if not closed:
                what = f"every step, {name}, 1,000 x {COLUMNS}, twin of {fits:.0f} fits"
            else:
                what = f"    residuals in closed form; same answers: {same} of {sampled}"
            yield Line(what=what, ours=ms(ours), other=ms(other), ratio=other / ours, goal=60)


def two_workers(replicates: int, repeats: int) -> Iterable[Line]:
    """Two processes beside one, every step on, beside what the machine gives any two processes now."""
    from joblib import Parallel, delayed

    plan = _plan()
    table = table_from_frame(plan, _frame(1_000))
    world = expected_world(plan, table, Stage.of(plan, table), SEED)
    two, pool = Engine(workers=2), Parallel(n_jobs=2)
    start = time.perf_counter()
    run_world(world, 2 * BLOCK, engine=two)
    first = time.perf_counter() - start
    shared, alone, counted, counted_alone = (
        statistics.median(times)
        for times in zip(
            *(
                (
                    timed(lambda: run_world(world, replicates, engine=two), time.perf_counter),
                    timed(lambda: run_world(world, replicates), time.perf_counter),
                    timed(lambda: pool(delayed(_count)() for _ in range(2)), time.perf_counter),
                    timed(lambda: [_count(), _count()], time.perf_counter),
                )
                for _ in range(repeats)
            ),
            strict=True,
        )
    )
    what = f"two processes, {replicates:,} replicates, every step (seconds by the clock)"
    yield Line(what=what, ours=f"{shared:.2f} s", other=f"{alone:.2f} s", ratio=alone / shared, goal=1.8)
    yield Line(what="    the same of counting to 20 million, which shares nothing", ours=f"{counted:.2f} s",
               other=f"{counted_alone:.2f} s", ratio=counted_alone / counted)  # fmt: skip
    yield Line(
        what="    their start and first two blocks", ours=f"{first:.2f} s", other="", ratio=first / shared
    )


def _count() -> int:
    """Work for one processor and nothing else."""
    total = 0
    for number in range(20_000_000):
        total += number
    return total


def memory() -> Iterable[Line]:
    """Ten times the replicates beside these."""
    few, many = _child(2_000), _child(20_000)
    what = "memory of noise, 10,000 rows: 20,000 replicates / 2,000"
    yield Line(what=what, ours=mib(many["grown"]), other=mib(few["grown"]),
               ratio=many["grown"] / few["grown"])  # fmt: skip
    yield Line(what="    of which trials that are kept", ours=mib(many["trials"]), other=mib(few["trials"]),
               ratio=many["trials"] / few["trials"])  # fmt: skip
    yield Line(what="    the rest: blocks", ours=mib(many["grown"] - many["trials"]),
               other=mib(few["grown"] - few["trials"]),
               ratio=(many["grown"] - many["trials"]) / (few["grown"] - few["trials"]),
               goal=1.5, at_most=True)  # fmt: skip


# -- memory ----------------------------------------------------------------------------------


def _child(replicates: int) -> dict[str, float]:
    """What a process of its own says about its memory."""
    done = subprocess.run(
        [sys.executable, str(HERE), "--child", str(replicates)], check=True, capture_output=True, text=True
    )
    found: dict[str, float] = json.loads(done.stdout.splitlines()[-1])
    return found


def _memory_of(replicates: int) -> dict[str, float]:
    """Growth of this process by a rehearsal in noise, in bytes, and what its trials take."""
    world = noise_world(_stage(_selecting(gate=False), _frame(10_000)), SEED)
    run_world(world, 1)
    before = peak()
    trials = run_world(world, replicates)
    return {
        "grown": float(peak() - before),
        "trials": float(sum(getattr(trials, one.name).nbytes for one in fields(trials))),
    }


if __name__ == "__main__":
    raise SystemExit(main())

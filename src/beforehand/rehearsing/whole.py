"""A whole rehearsal: which worlds are tried, what they came to, and the record of it."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import ExitStack
from dataclasses import dataclass, replace
from pathlib import Path

from beforehand.plan import Plan, decisions_digest, whole_digest
from beforehand.record.whole import environment
from beforehand.rehearsing.batch import Batch
from beforehand.rehearsing.engines import BLOCK, ONE_WORKER, Engine, Progress, Saved, rehearsal_key, run_world
from beforehand.rehearsing.expected import declared_subjects, drawn_worlds, expected_world, true_slopes
from beforehand.rehearsing.hold_out import held_out_of, hold_out_world
from beforehand.rehearsing.models import (
    ExpectedFigures,
    HoldOutFigures,
    NoiseFigures,
    RehearsalRecord,
    RehearsedData,
    RehearsedPlan,
    ResampleFigures,
    Scenarios,
    ScrambledRun,
)
from beforehand.rehearsing.noise import noise_world
from beforehand.rehearsing.observed import Observed
from beforehand.rehearsing.resample import BOOTSTRAP, HALF_SAMPLES, SampleWorld
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.summaries.expected import expected_figures
from beforehand.rehearsing.summaries.hold_out import hold_out_figures
from beforehand.rehearsing.summaries.noise import noise_figures
from beforehand.rehearsing.summaries.resample import resample_figures
from beforehand.rehearsing.text import with_digest
from beforehand.rehearsing.trials import Subjects, Trials
from beforehand.rehearsing.world import World

# Replicates that are computed together where they are computed side by side.
WIDE_BLOCK = 500

# Outcomes or weights of a block have so many cells at most, however many rows there are.
BLOCK_CELLS = 5_000_000
FEWEST = 5


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """What a rehearsal is asked for.

    Attributes
    ----------
    scenarios : tuple of str
        Those that are to be rehearsed, scrambled not among them.
    replicates, seed : int
    rows : tuple of int
        Numbers of rows for which the expected world is tried as well.
    engine : Engine
    left_out : tuple of str
        Why other scenarios are not rehearsed, one sentence each.
    part : Path or None
        Where finished blocks are kept.
    resume : bool
        Whether blocks that are kept there are used.
    """

    scenarios: tuple[str, ...]
    replicates: int
    seed: int
    rows: tuple[int, ...] = ()
    engine: Engine = ONE_WORKER
    left_out: tuple[str, ...] = ()
    part: Path | None = None
    resume: bool = False


def rehearsed(
    plan: Plan,
    stage: Stage | None,
    asked: Asked,
    *,
    observed: Observed | None = None,
    scrambled: ScrambledRun | None = None,
    progress: Progress | None = None,
) -> RehearsalRecord:
    """Rehearse a plan.

    Parameters
    ----------
    plan : Plan
    stage : Stage or None
        Of the plan on its table; without a table only the expected world can be rehearsed.
    asked : Asked
    observed : Observed, optional
        The real run, where there has been one.
    scrambled : ScrambledRun, optional
        The dry run on a shuffled outcome, where it was made.
    progress : callable, optional

    Returns
    -------
    RehearsalRecord
        Digest included; the same for any number of workers.

    Raises
    ------
    Interrupted
        On an interrupt; what is finished stands in the part file.
    PlanError, DataError, InputError
    """
    table = None if stage is None else stage.setting.table
    with ExitStack() as open_files:
        saved: Saved | None = None
        if asked.part is not None:
            key = rehearsal_key(plan, None if table is None else table.fingerprint, asked.seed)
            saved = open_files.enter_context(
                Saved(asked.part, key, resume=asked.resume, name=asked.part.name)
            )
        machine = _Machine(asked, saved, progress)
        made = Scenarios(
            scrambled=scrambled,
            noise=_noise(plan, stage, asked, machine, observed),
            expected=_expected(plan, stage, asked, machine),
            resample=_resample(plan, stage, asked, machine, observed),
            hold_out=_hold_out(stage, asked, machine),
        )
        if saved is not None:
            saved.remove()
    origin = plan.origin
    return with_digest(
        RehearsalRecord(
            rehearsal=1,
            plan=RehearsedPlan(
                file=Path(origin.path).name if origin is not None and origin.path else "plan.yaml",
                decisions=decisions_digest(plan),
                whole=whole_digest(plan),
            ),
            data=None
            if table is None
            else RehearsedData(file=table.file, fingerprint=table.fingerprint, rows=table.ledger[0].rows),
            lock=None if observed is None else observed.lock,
            seed=asked.seed,
            replicates=asked.replicates,
            scenarios=made,
            not_rehearsed=asked.left_out,
            environment=environment(),
        )
    )


@dataclass(frozen=True, slots=True)
class _Machine:
    """Runs worlds as they were asked for."""

    asked: Asked
    saved: Saved | None
    progress: Progress | None

    def run(self, world: World, replicates: int, rows: int, *, wide: bool = False) -> Trials:
        """Every replicate of a world."""
        engine = self.asked.engine
        if wide and engine.kind == "local":
            # Side by side they are done before other processes would have started.
            engine = replace(engine, workers=1)
        return run_world(
            world, replicates, engine=engine, progress=self.progress, saved=self.saved,
            block=block_of(rows, wide=wide),
        )  # fmt: skip


def block_of(rows: int, *, wide: bool) -> int:
    """Replicates of a block: the same for a table however they are computed."""
    return max(FEWEST, min(WIDE_BLOCK if wide else BLOCK, BLOCK_CELLS // max(rows, 1)))


def _wide(stage: Stage) -> bool:
    """Whether replicates on a stage are computed side by side."""
    return Batch.of(stage.setting.fresh(), stage.subjects) is not None


def _noise(
    plan: Plan, stage: Stage | None, asked: Asked, machine: _Machine, observed: Observed | None
) -> NoiseFigures | None:
    if stage is None or "noise" not in asked.scenarios:
        return None
    trials = machine.run(noise_world(stage, asked.seed), asked.replicates, stage.n_rows, wide=_wide(stage))
    return noise_figures(trials, stage.subjects, plan.alpha, observed)


def _expected(plan: Plan, stage: Stage | None, asked: Asked, machine: _Machine) -> ExpectedFigures | None:
    if "expected" not in asked.scenarios:
        return None
    by_rows: list[tuple[int, Trials]] = []
    subjects: Subjects
    table = None if stage is None else stage.setting.table
    if stage is not None and table is not None:
        subjects = stage.subjects
        world = expected_world(plan, table, stage, asked.seed)
        by_rows.append((stage.n_rows, machine.run(world, asked.replicates, stage.n_rows, wide=_wide(stage))))
    else:
        subjects = declared_subjects(plan)
    for drawn in drawn_worlds(plan, table, asked.rows, None if stage is None else subjects, asked.seed):
        by_rows.append((drawn.rows, machine.run(drawn, asked.replicates, drawn.rows)))
    return expected_figures(by_rows, subjects, true_slopes(plan), plan.alpha)


def _resample(
    plan: Plan, stage: Stage | None, asked: Asked, machine: _Machine, observed: Observed | None
) -> ResampleFigures | None:
    if stage is None or "resample" not in asked.scenarios:
        return None
    seen = () if observed is None else observed.rulings
    half = SampleWorld(name=HALF_SAMPLES, stage=stage, seen=(), seed=asked.seed)
    boot = SampleWorld(name=BOOTSTRAP, stage=stage, seen=seen, seed=asked.seed)
    parts = [
        machine.run(world, asked.replicates, stage.n_rows, wide=world.side_by_side) for world in (half, boot)
    ]
    rows = half.table(0).n_rows
    return resample_figures(parts[0], parts[1], stage.subjects, observed, plan.alpha, half_rows=rows)


def _hold_out(stage: Stage | None, asked: Asked, machine: _Machine) -> HoldOutFigures | None:
    if stage is None or "hold_out" not in asked.scenarios:
        return None
    world = hold_out_world(stage, asked.seed)
    trials = machine.run(world, world.repeats(asked.replicates) * world.folds, stage.n_rows)
    return hold_out_figures(held_out_of(world, trials))


def choice(
    plan: Plan, named: Sequence[str], *, has_table: bool, has_run: bool, written: bool
) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Which scenarios are rehearsed, and why others are not.

    Parameters
    ----------
    plan : Plan
    named : sequence of str
        Scenarios named on the command line; empty for those of the plan.
    has_table, has_run : bool
        Whether there is a table, and a lock of this plan on it.
    written : bool
        Whether the plan itself names its scenarios.

    Returns
    -------
    tuple of scenarios and sentences
        A scenario that was named is not left out; what it lacks is a fault, or a look.
    """
    if named:
        return tuple(dict.fromkeys(named)), ()
    chosen: list[str] = []
    why: list[str] = []
    for name in plan.rehearsal.scenarios:
        if name == "expected" and plan.expects is None and not written:
            why.append("expected: the plan does not say what it expects, in a block `expects`.")
        elif name != "expected" and not has_table:
            why.append(f"{name}: there is no table yet.")
        elif name in ("resample", "hold_out") and not has_run and not written:
            why.append(
                f"{name}: it looks at the outcome, and the plan has not been run on this table yet; "
                f"--scenario {name} does so at once, and counts as a look."
            )
        else:
            chosen.append(name)
    return tuple(chosen), tuple(why)

"""``beforehand rehearse``: what a plan does to noise, to the expected effects and to other samples."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from beforehand.cli import terminal
from beforehand.cli.options import AsJson, DataFile, PlanFile, ShowProgress
from beforehand.cli.progress import Progress
from beforehand.cli.targets import refuse_to_replace, require_folder


class Scenario(StrEnum):
    """A world in which a plan is tried."""

    scrambled = "scrambled"
    noise = "noise"
    expected = "expected"
    resample = "resample"
    hold_out = "hold_out"


class EngineKind(StrEnum):
    """Who computes."""

    local = "local"
    dask = "dask"


MOST_REPLICATES = 10_000_000
LARGEST_SEED = 2**63 - 1
MOST_WORKERS = 1024


def _whole_number(least: int, most: int) -> Callable[[int | None], int | None]:
    """A check of an option that takes a whole number within bounds."""

    def check(value: int | None) -> int | None:
        if value is not None and not least <= value <= most:
            raise typer.BadParameter(f"{value} is not between {least:,} and {most:,}")
        return value

    return check


# With fewer, the error of a share near 5 % is more than two points.
FEW = 100


def rehearse(
    plan: PlanFile,
    data: DataFile = None,
    scenario: Annotated[
        list[Scenario] | None,
        typer.Option(
            "--scenario",
            metavar="WORLD",
            help="Rehearse this world: scrambled, noise, expected, resample or hold_out; may be given "
            "several times. Without it: those of the plan.",
            show_default=False,
        ),
    ] = None,
    replicates: Annotated[
        int | None,
        typer.Option(
            "--replicates",
            metavar="N",
            callback=_whole_number(1, MOST_REPLICATES),
            help="Tables of each world. Without it: as many as the plan says.",
        ),
    ] = None,
    seed: Annotated[
        int | None,
        typer.Option(
            "--seed",
            metavar="N",
            callback=_whole_number(0, LARGEST_SEED),
            help="Seed. Without it: that of the plan.",
        ),
    ] = None,
    rows: Annotated[
        str | None,
        typer.Option(
            "--rows",
            metavar="LIST",
            help="Try the expected world at these numbers of rows too, such as 100,200,400.",
        ),
    ] = None,
    workers: Annotated[
        int | None,
        typer.Option(
            "--workers",
            metavar="N",
            callback=_whole_number(1, MOST_WORKERS),
            help="Processes. Without it: one for each core.",
            show_default=False,
        ),
    ] = None,
    engine: Annotated[
        EngineKind,
        typer.Option(
            "--engine",
            metavar="KIND",
            help="local, this machine, or dask, a cluster that is there already.",
            show_default=False,
        ),
    ] = EngineKind.local,
    scheduler: Annotated[
        str | None,
        typer.Option("--scheduler", metavar="ADDRESS", help="Scheduler of the cluster, tcp://HOST:PORT."),
    ] = None,
    resume: Annotated[
        bool,
        typer.Option("--resume", help="Go on where an interrupted rehearsal was.", show_default=False),
    ] = False,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write the record here. Without it: NAME.rehearsal.yaml beside the plan.",
            show_default=False,
        ),
    ] = None,
    as_json: AsJson = False,
    progress: ShowProgress = False,
) -> None:
    """Try a plan on worlds whose truth is known, and say how it does.

    How often would these very rules find something in pure noise; how often the effects that the
    plan expects; and, after a run, how stable are its choices and how optimistic is its R²? The
    same steps as in a run are run thousands of times.
    """
    from beforehand import api
    from beforehand.names import beside
    from beforehand.rehearsals import SCRAMBLED_SUFFIX, with_earlier
    from beforehand.rehearsing.engines import Interrupted
    from beforehand.rehearsing.reading import RECORD_SUFFIX

    record = output or beside(plan, RECORD_SUFFIX)
    dry = beside(plan, SCRAMBLED_SUFFIX)
    for path in (record, dry):
        require_folder(path)
    refuse_to_replace(record, "\nrehearsal: ", "the record of a rehearsal")
    refuse_to_replace(dry, "\nscrambled: ", "the lockfile of a dry run")
    grid = _grid(rows)
    if scheduler is not None and engine is EngineKind.local:
        raise typer.BadParameter("belongs to --engine dask", param_hint="--scheduler")
    who = api.Engine(kind=engine.value, workers=workers or _cores(), scheduler=scheduler)
    with Progress(f"rehearsing {plan.name}", plain=progress) as told:
        try:
            made = api.rehearse(
                plan, data, scenarios=tuple(one.value for one in scenario or ()), replicates=replicates,
                seed=seed, rows=grid, engine=who, resume=resume, keep=True, progress=told,
            )  # fmt: skip
        except Interrupted as stopped:
            terminal.note(
                f"{stopped.world}: interrupted; {stopped.done:,} of {stopped.of:,} replicates are kept: "
                "go on with --resume"
            )
            raise typer.Exit(130) from None
        told("writing the record")
        whole, lost = with_earlier(made.record, record)
        api.write_rehearsal(whole, record)
        if made.scrambled is not None:
            api.write_lock(made.scrambled, dry)
    for line in _notes(whole.replicates, made.looked, lost):
        terminal.note(line)
    if as_json:
        from beforehand.cli.machine import json_text

        terminal.document(json_text(whole))
        return
    from beforehand.screen.rehearsal import rehearsal_text

    terminal.say(rehearsal_text(whole, str(record), width=terminal.width(), colour=terminal.colour()))


def _notes(replicates: int, looked: bool, lost: Sequence[str]) -> list[str]:
    """What a reader of any form of the result should know."""
    notes: list[str] = []
    if replicates < FEW:
        error = 100.0 * (0.05 * 0.95 / replicates) ** 0.5
        notes.append(
            f"warning: {replicates} replicates are few: a share near 5 % has a standard error of {error:.1f} "
            "percentage points"
        )
    if lost:
        notes.append(
            f"{', '.join(lost)} of the earlier record went: another plan, table, seed or number of replicates"
        )
    if looked:
        notes.append(
            "this rehearsal looked at the outcome before any run: it stands in the register of looks"
        )
    return notes


def _grid(rows: str | None) -> tuple[int, ...]:
    """Numbers of rows from a list with commas."""
    found: list[int] = []
    for part in (rows or "").replace(" ", "").split(","):
        if not part and rows is None:
            continue
        if not part.isdecimal() or not 3 <= int(part) <= 10_000_000:
            raise typer.BadParameter(
                f"{part!r} is no number of rows; a list such as 100,200,400 is", param_hint="--rows"
            )
        found.append(int(part))
    return tuple(found)


def _cores() -> int:
    """Cores that this process may use."""
    import os

    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:
        # Not every system tells which cores a process may use.
        return os.cpu_count() or 1

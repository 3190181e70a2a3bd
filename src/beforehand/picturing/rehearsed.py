"""What a rehearsal says of the choices: how often each predictor and each answer comes back."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from beforehand.lock import Lock
from beforehand.picturing.picture import Picture, listed, shown
from beforehand.picturing.sheet import (
    BLUE,
    GREEN,
    INK,
    ORANGE,
    QUIET,
    SMALL,
    WIDTH,
    Sheet,
    bar,
    mark,
    put,
    stroke,
)
from beforehand.rehearsing.models import RehearsalRecord

if TYPE_CHECKING:
    from matplotlib.axes import Axes

INCLUSION_TITLE = "How often is each predictor adopted?"
MODELS_TITLE = "How often does the same answer come back?"

MOST_PREDICTORS, MOST_MODELS = 40, 10
PITCH = 0.215


@dataclass(frozen=True, slots=True)
class Included:
    """Shares of replicates that adopt one predictor; None for a world that was not rehearsed."""

    name: str
    halves: float | None
    halves_error: float | None
    noise: float | None
    kept: bool | None


@dataclass(frozen=True, slots=True)
class Came:
    """One answer of the half-samples: how often it came, and how it differs from the real one."""

    words: str
    share: float
    error: float | None
    real: bool


def inclusion(record: RehearsalRecord, lock: Lock | None = None) -> Picture | None:
    """How often each predictor is adopted on half-samples and where nothing has an effect.

    None where neither of the two worlds was rehearsed.
    """
    found = included(record, lock)
    if not found:
        return None
    drawn = found
    if len(found) > MOST_PREDICTORS:
        most = sorted(range(len(found)), key=lambda at: (-_largest(found[at]), at))[:MOST_PREDICTORS]
        drawn = tuple(one for at, one in enumerate(found) if at in set(most))
    resample, noise = record.scenarios.resample, record.scenarios.noise
    note = ""
    if resample is not None:
        note += (
            f"Dots: share of halves of the rows ({resample.half_samples.rows:,} each) on which the plan "
            "adopts it; "
        )
        note += "filled where the real answer has it. " if lock is not None else ""
    if noise is not None:
        note += "Diamonds: the same where no predictor has an effect; those that a rule keeps have none. "
    note += f"{record.replicates:,} replicates; lines are two Monte Carlo errors to either side."
    if len(drawn) < len(found):
        note += f" {len(drawn)} of {len(found)} are shown, those most often adopted."
    ordered = sorted((one for one in found if one.halves is not None), key=lambda one: -(one.halves or 0.0))
    alt = ""
    if ordered:
        said = listed([f"{shown(one.name)} {_percent(one.halves)}" for one in ordered], 15)
        alt += f"Adopted on halves of the rows: {said}. "
    by_noise = sorted((one for one in found if one.noise is not None), key=lambda one: -(one.noise or 0.0))
    if by_noise:
        said = listed([f"{shown(one.name)} {_percent(one.noise)}" for one in by_noise], 8)
        alt += f"Where nothing has an effect: {said}."
    return Picture(
        name="inclusion",
        title=INCLUSION_TITLE,
        alt=alt.strip(),
        note=note,
        width=WIDTH,
        height=PITCH * len(drawn) + 0.66,
        draw=lambda sheet: _draw_inclusion(sheet, drawn, noise is not None, resample is not None),
    )


def models(record: RehearsalRecord, lock: Lock | None = None) -> Picture | None:
    """The answers that come most often on halves of the rows; None without them."""
    came = answers(record, lock)
    if not came or record.scenarios.resample is None:
        return None
    halves = record.scenarios.resample.half_samples
    rest = max(1.0 - sum(one.share for one in came), 0.0)
    compared = lock is not None and lock.answer is not None
    note = (
        f"Halves of the rows ({halves.rows:,} each) came to {halves.different_models:,} different sets of "
        f"predictors; "
        f"the {len(came)} most frequent are shown, the others make up {_percent(rest)}."
    )
    if compared and not any(one.real for one in came):
        note += " The real answer is not among them."
    if compared:
        note += " Each is told by what it has more (+) and less (−) than the real answer."
    said = listed([f"{one.words}: {_percent(one.share)}" for one in came], 5)
    return Picture(
        name="models",
        title=MODELS_TITLE,
        alt=(
            f"{halves.different_models:,} different answers on halves of the rows. The most frequent: {said}."
        ),
        note=note,
        width=WIDTH,
        height=PITCH * 1.45 * len(came) + 0.62,
        draw=lambda sheet: _draw_models(sheet, came),
    )


def included(record: RehearsalRecord, lock: Lock | None) -> tuple[Included, ...]:
    """Every predictor of either world, in plan order."""
    resample, noise = record.scenarios.resample, record.scenarios.noise
    halves = {} if resample is None else dict(resample.half_samples.inclusion)
    alone = {} if noise is None else dict(noise.adopted)
    kept: Mapping[str, bool] = (
        {} if lock is None else {name: fate.verdict != "removed" for name, fate in lock.predictors.items()}
    )
    found: list[Included] = []
    for name in dict.fromkeys([*halves, *alone]):
        half, by_noise = halves.get(name), alone.get(name)
        found.append(
            Included(
                name=name,
                halves=None if half is None else half.value,
                halves_error=None if half is None else half.mc_error,
                noise=None if by_noise is None else by_noise.value,
                kept=kept.get(name),
            )
        )
    return tuple(found)


def answers(record: RehearsalRecord, lock: Lock | None) -> tuple[Came, ...]:
    """The most frequent answers, told by how they differ from the real one where it is known."""
    if record.scenarios.resample is None:
        return ()
    real: frozenset[str] | None = None
    if lock is not None and lock.answer is not None:
        adopted = [name for name, fate in lock.predictors.items() if fate.verdict == "adopted"]
        real = frozenset(adopted)
    return tuple(
        Came(
            words=_told(one.predictors, real, () if lock is None else tuple(lock.predictors)),
            share=one.share.value,
            error=one.share.mc_error,
            real=real is not None and frozenset(one.predictors) == real,
        )
        for one in record.scenarios.resample.half_samples.models[:MOST_MODELS]
    )


def _told(names: tuple[str, ...], real: frozenset[str] | None, order: tuple[str, ...]) -> str:
    """An answer in words: what it has more and less than the real one, or all of it."""
    if real is None:
        return ", ".join(map(shown, names)) if names else "none adopted"
    if frozenset(names) == real:
        return "the real answer" if names else "none adopted, as in the real run"
    if not names:
        return "none adopted"
    more = [f"+ {shown(name)}" for name in names if name not in real]
    less = [f"− {shown(name)}" for name in order if name in real and name not in names]
    return "  ".join([*more, *less])


def _largest(one: Included) -> float:
    return max(one.halves or 0.0, one.noise or 0.0)


def _percent(value: float | None) -> str:
    return "unknown" if value is None else f"{100 * value:.3g} %"


def _shares(axes: Axes) -> None:
    """An axis of shares from nothing to all."""
    axes.set_xticks([0.0, 0.25, 0.5, 0.75, 1.0], ["0 %", "25 %", "50 %", "75 %", "100 %"])


def _draw_inclusion(sheet: Sheet, found: tuple[Included, ...], noise: bool, halves: bool) -> None:
    names = 0.16 + sheet.room_for([shown(one.name) for one in found], 0.9, 2.2)
    width = sheet.width - names - 0.62
    axes = sheet.axes(names, 0.24, width, PITCH * len(found), lines="x")
    axes.set(xlim=(-0.015, 1.015), ylim=(len(found) - 0.5, -0.5), yticks=[])
    _shares(axes)
    axes.spines["left"].set_visible(False)
    axes.set_xlabel("share of replicates")
    for at, one in enumerate(found):
        put(axes, -0.09 / width, at, sheet.fitted(shown(one.name), names - 0.1), at="right",
            transform=axes.get_yaxis_transform())  # fmt: skip
        if one.halves is not None and one.noise is not None:
            stroke(axes, sorted((one.halves, one.noise)), (at, at), strength=0.3, width=0.8, above=1.0)
        if one.noise is not None:
            mark(axes, one.noise, at, shape="D", size=3.8, colour=ORANGE, hollow=True, name="noise")
        if one.halves is not None:
            half = 2.0 * (one.halves_error or 0.0)
            stroke(
                axes,
                (max(one.halves - half, 0.0), min(one.halves + half, 1.0)),
                (at, at),
                colour=BLUE,
                width=1.6,
                name="error",
            )
            mark(axes, one.halves, at, size=4.8, colour=BLUE, hollow=one.kept is False, name="halves")
            put(axes, 1.0 + 0.13 / width, at, _percent(one.halves), size=SMALL,
                transform=axes.get_yaxis_transform())  # fmt: skip
    legend = [("o", "on halves of the rows", BLUE)] if halves else []
    legend += [("D", "where nothing has an effect", ORANGE)] if noise else []
    x = 0.0
    for shape, words, colour in legend:
        axes.plot([x + 0.05 / width], [1.0 + 0.11 / (PITCH * len(found))], marker=shape, markersize=4.0,
                  markerfacecolor=colour if shape == "o" else "none", markeredgecolor=colour, clip_on=False,
                  transform=axes.transAxes)  # fmt: skip
        put(axes, x + 0.14 / width, 1.0 + 0.11 / (PITCH * len(found)), words, size=SMALL, strength=0.85,
            transform=axes.transAxes)  # fmt: skip
        x += (sheet.width_of(words, SMALL) + 0.4) / width


def _draw_models(sheet: Sheet, came: tuple[Came, ...]) -> None:
    from matplotlib.ticker import MaxNLocator

    pitch = PITCH * 1.45
    axes = sheet.axes(0.2, 0.12, sheet.width - 0.8, pitch * len(came), lines="x")
    most = max(max(one.share for one in came), 1e-6)
    reach = max(min(one.share + 2.0 * (one.error or 0.0), 1.3 * most) for one in came)
    axes.set(xlim=(0.0, 1.02 * max(reach, most)), ylim=(len(came) - 0.5, -0.5), yticks=[])
    axes.xaxis.set_major_locator(MaxNLocator(6))
    axes.xaxis.set_major_formatter(lambda value, _: f"{100 * value:.3g} %")
    axes.set_xlabel("share of halves of the rows")
    axes.axvline(0.0, color=INK, linewidth=0.6, alpha=QUIET)
    for at, one in enumerate(came):
        bar(axes, 0.0, one.share, at + 0.2, 0.26, colour=GREEN if one.real else BLUE, name="model")
        if one.error is not None:
            ends = (max(one.share - 2 * one.error, 0.0), one.share + 2 * one.error)
            stroke(axes, ends, (at + 0.2, at + 0.2), width=0.8, strength=0.7, name="error")
        put(
            axes,
            0.006 * most,
            at - 0.16,
            sheet.fitted(one.words, sheet.width - 0.9, SMALL + 0.5),
            size=SMALL + 0.5,
        )
        put(axes, 1.0 + 0.1 / (sheet.width - 0.8), at + 0.2, _percent(one.share), size=SMALL,
            transform=axes.get_yaxis_transform())  # fmt: skip

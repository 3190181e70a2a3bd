"""What a rehearsal came to, on about one screen, for people without a degree in statistics."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import count, figure, listed, percent, trimmed
from beforehand.screen.layout import Column, Section, Tone, labelled, page, shown, table, wrapped
from beforehand.screen.resampling import hold_out_section, resample_section
from beforehand.screen.shares import number_text, percent_text

if TYPE_CHECKING:
    from beforehand.rehearsing.figures import Estimate
    from beforehand.rehearsing.models import (
        AtRows,
        ExpectedFigures,
        ExpectedPredictorFigures,
        NoiseFigures,
        PSpread,
        RehearsalRecord,
        Statuses,
    )

# More predictors than so many do not fit on a screen; the record has all of them.
MOST_PREDICTORS = 12
# A grid of rows beside more effects than so many is no table for a screen.
MOST_EFFECTS_BESIDE = 5
# With fewer replicates the error of a share near 5 % is above two points.
FEW_REPLICATES = 100

# Chances of a false find above this are set off by colour: twice the usual alpha.
CAREFUL_ABOVE = 0.10


def rehearsal_text(record: RehearsalRecord, path: str, *, width: int = 100, colour: bool = False) -> str:
    """A rehearsal as text; the chance of a false find beside real effects stands first.

    Parameters
    ----------
    record : RehearsalRecord
    path : str
        Name of the record's file.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    made = record.scenarios
    sections = [_head(record, path, width)]
    if made.expected is not None:
        sections.append(_expected(made.expected, width))
    if made.noise is not None:
        sections.append(_noise(made.noise, width))
    if made.resample is not None:
        sections.append(resample_section(made.resample, MOST_PREDICTORS, width))
    if made.hold_out is not None:
        sections.append(hold_out_section(made.hold_out, width))
    if made.scrambled is not None:
        told = (
            f"The outcome was shuffled and the whole plan run: {_ended(made.scrambled.status)}. "
            f"{made.scrambled.lock} is marked as scrambled; it says nothing about the real outcome."
        )
        sections.append(Section(title="A dry run on a shuffled outcome", lines=wrapped(told, width)))
    if record.not_rehearsed:
        lines = [line for text in record.not_rehearsed for line in wrapped(text, width, first="  - ")]
        sections.append(Section(title="Not rehearsed", lines=tuple(lines)))
    told = (
        "± is the Monte Carlo standard error: what another seed would change. What each figure means and "
        "what to change in a plan: beforehand guide rehearse"
    )
    sections.append(Section(title="Reading it", lines=wrapped(told, width)))
    return page(sections, colour=colour)


def _head(record: RehearsalRecord, path: str, width: int) -> Section:
    """What was rehearsed, how often, and whether that is enough."""
    on = "on drawn predictors" if record.data is None else f"on {count(record.data.rows, 'row')} of "
    on += "" if record.data is None else record.data.file
    how = f"{count(record.replicates, 'replicate')} of each world, seed {record.seed}"
    lines = wrapped(f"{record.plan.file}, {how}, {on}.", width)
    if record.replicates < FEW_REPLICATES:
        error = (0.05 * 0.95 / record.replicates) ** 0.5
        lines += wrapped(
            f"{count(record.replicates, 'replicate')} are few: a share near 5 % has a standard error of "
            f"{percent(error)}.",
            width,
        )
    return Section(title=f"Rehearsal: {shown(path)}", lines=lines)


def _tone(chance: Estimate | None) -> Tone:
    """Careful where false finds are frequent."""
    return "careful" if chance is not None and chance.value > CAREFUL_ABOVE else "plain"


def _expected(made: ExpectedFigures, width: int) -> Section:
    """False finds beside real effects, then how well the effects are found."""
    chance = made.any_without_effect_adopted
    told = (
        "Every predictor that may be left out has an effect here, so there is nothing to find falsely."
        if chance is None
        else "At least one predictor without an effect is adopted in "
        f"{percent_text(chance)} of tables of {count(made.rows, 'row')}."
    )
    lines = wrapped(told, width) + _effects(made, width)
    if len(made.by_rows) > 1:
        lines += _grid(made, width)
    lines += _unfinished(made.statuses, width)
    return Section(title="If the expected effects are real", lines=lines, tone=_tone(chance))


def _effects(made: ExpectedFigures, width: int) -> tuple[str, ...]:
    """One line an effect."""
    if not made.predictors:
        return wrapped("The plan expects no effect.", width)
    names = tuple(made.predictors)[:MOST_PREDICTORS]
    those = [made.predictors[name] for name in names]
    columns = (
        Column(head="", texts=tuple(map(shown, names)), align="left", least=10),
        Column(head="True", texts=tuple("" if one.true is None else trimmed(one.true, 4) for one in those)),
        Column(head="Found", texts=tuple(percent_text(one.power) for one in those)),
        Column(head="Too large, times", texts=tuple(number_text(one.exaggeration) for one in those)),
        Column(head="Wrong sign", texts=tuple(percent_text(one.wrong_sign) for one in those)),
        Column(head="Interval holds it", texts=tuple(percent_text(one.coverage) for one in those)),
    )
    drawn = table(columns, width)
    if drawn is None:
        drawn = labelled([(name, _in_words(one)) for name, one in zip(names, those, strict=True)], width)
    return drawn + _more(len(made.predictors) - len(names), width)


def _in_words(one: ExpectedPredictorFigures) -> str:
    """An effect on a narrow screen."""
    told = f"found in {percent_text(one.power)}"
    return told if one.exaggeration is None else f"{told}, {number_text(one.exaggeration)} times too large"


def _grid(made: ExpectedFigures, width: int) -> tuple[str, ...]:
    """The same over numbers of rows, and how many rows each effect needs."""
    effects = tuple(made.predictors)
    lines: tuple[str, ...] = ()
    if len(effects) <= MOST_EFFECTS_BESIDE:
        drawn = table(_grid_columns(made.by_rows, effects), width)
        lines = ("", *drawn) if drawn else ()
    needed = made.rows_needed or {}
    told = [
        f"{name} {rows:,}" if rows is not None else f"{name} none of these" for name, rows in needed.items()
    ]
    if told:
        most = f"Fewest rows of these that find it in 80 % of tables: {', '.join(told[:MOST_PREDICTORS])}."
        lines += wrapped(most, width)
    return lines


def _grid_columns(by_rows: tuple[AtRows, ...], effects: tuple[str, ...]) -> tuple[Column, ...]:
    return (
        Column(head="Rows", texts=tuple(f"{at.rows:,}" for at in by_rows)),
        Column(
            head="Any without effect",
            texts=tuple(percent_text(at.any_without_effect_adopted) for at in by_rows),
        ),
        *(
            Column(head=f"{shown(name)} found", texts=tuple(percent_text(at.power[name]) for at in by_rows))
            for name in effects
        ),
    )


def _noise(made: NoiseFigures, width: int) -> Section:
    """What is adopted where nothing is there to find."""
    lines = wrapped(
        f"Something is adopted in {percent_text(made.any_adopted)} of tables, "
        f"{number_text(made.predictors_adopted.mean)} predictors on average.",
        width,
    )
    often = sorted(made.adopted.items(), key=lambda item: -item[1].value)
    if often:
        told = listed([f"{name} {percent_text(one)}" for name, one in often[:5]])
        lines += wrapped(f"{'Most often' if len(often) > 5 else 'Each'}: {told}.", width)
    if made.r_squared is not None:
        lines += wrapped(
            f"R² is {number_text(made.r_squared.q50)} in the middle one of these tables, and "
            f"{number_text(made.r_squared.q95)} or more in one of twenty.",
            width,
        )
    if made.full_p is not None:
        lines += wrapped(_tested(made.full_p), width)
    real = made.calibrated
    if real is not None and real.r_squared > 0:
        told = f"The real answer's R² of {figure(real.r_squared)} or more comes up in "
        told += f"{percent_text(real.p_of_r_squared)} of them"
        if real.p_of_model_p is not None:
            told += f", its p or a smaller one in {percent_text(real.p_of_model_p)}"
        lines += wrapped(f"{told}.", width)
    if made.held:
        lines += wrapped(f"Always kept and not counted: {listed(made.held, MOST_PREDICTORS)}.", width)
    return Section(
        title="If nothing has an effect",
        lines=lines + _unfinished(made.statuses, width),
        tone=_tone(made.any_adopted),
    )


def _tested(full: PSpread) -> str:
    """How the F test before selection behaves."""
    return (
        "Before selection the F test of all predictors together is significant in "
        f"{percent_text(full.at_or_below_alpha)} of them."
    )


def _unfinished(statuses: Statuses, width: int) -> tuple[str, ...]:
    """How many replicates came to no answer."""
    lost = [
        f"{word} {percent_text(share)}"
        for word, share in (("stopped", statuses.stopped), ("without a fit", statuses.no_fit))
        if share.value > 0
    ]
    if not lost:
        return ()
    return wrapped(f"Tables without an answer count as adopting nothing: {listed(lost)}.", width)


def _ended(status: str) -> str:
    """How a run ended, in words."""
    words = {
        "adopted": "it came to an answer",
        "mean_only": "it came to the mean",
        "inconclusive": "it came to a weak model",
        "stopped": "it stopped",
    }
    return words.get(status, status)


def _more(left: int, width: int) -> tuple[str, ...]:
    return wrapped(f"{left:,} more stand in the record.", width) if left > 0 else ()

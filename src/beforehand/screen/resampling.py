"""How stable the choices of a plan are, how optimistic its R², how far its predictions are off."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import beside, count, figure, listed
from beforehand.screen.layout import Column, Section, labelled, shown, table, wrapped
from beforehand.screen.shares import number_text, percent_text

if TYPE_CHECKING:
    from beforehand.rehearsing.models import Bootstrap, HoldOutFigures, Interval, ResampleFigures, RulingShare

# Rulings that fall otherwise more often than in one replicate of five are told, the least stable first.
STABLE = 0.8
MOST_RULINGS = 3


def resample_section(made: ResampleFigures, most: int, width: int) -> Section:
    """Choices on halves, estimates on rows drawn anew; a table of at most ``most`` predictors."""
    half, boot = made.half_samples, made.bootstrap
    lines = _predictors(made, most, width)
    top = half.models[0] if half.models else None
    if top is not None:
        which = listed(top.predictors, 6) if top.predictors else "no predictor"
        lines += wrapped(
            f"The most frequent answer on halves of {count(half.rows, 'row')} has {which}, in "
            f"{percent_text(top.share)} of them; {count(half.different_models, 'answer')} in all.",
            width,
        )
    lines += _optimism(boot, width)
    shaky = sorted((one for one in boot.rulings if one.same.value < STABLE), key=lambda one: one.same.value)[
        :MOST_RULINGS
    ]
    if shaky:
        told = listed([_ruling(one) for one in shaky])
        lines += wrapped(f"Rulings that fall the same way least often: {told}.", width)
    return Section(title="On other samples from the same rows", lines=lines)


def _predictors(made: ResampleFigures, most: int, width: int) -> tuple[str, ...]:
    """One line a predictor, the most often adopted first."""
    half, boot = made.half_samples, made.bootstrap
    order = sorted(half.inclusion, key=lambda name: -half.inclusion[name].value)
    names = order[:most]
    columns = (
        Column(head="", texts=tuple(map(shown, names)), align="left", least=10),
        Column(head="On halves", texts=tuple(percent_text(half.inclusion[name]) for name in names)),
        Column(head="Sign kept", texts=tuple(percent_text(half.sign_stability.get(name)) for name in names)),
        Column(
            head="Bias where chosen",
            texts=tuple(percent_text(boot.relative_conditional_bias.get(name)) for name in names),
        ),
        Column(head="Spread, times", texts=tuple(number_text(boot.rmsd_ratio.get(name)) for name in names)),
        Column(head="Interval", texts=tuple(_interval(boot.intervals.get(name)) for name in names)),
    )
    for chosen in (columns, columns[:5], columns[:3]):
        drawn = table(chosen, width)
        if drawn is not None:
            break
    else:
        drawn = labelled([(name, percent_text(half.inclusion[name])) for name in names], width)
    left = len(order) - len(names)
    return drawn + (wrapped(f"{left:,} more stand in the record.", width) if left > 0 else ())


def _interval(made: Interval | None) -> str:
    """An interval with selection in it, bias-corrected where there is one."""
    ends = None if made is None else made.bias_corrected or made.percentile
    if ends is None:
        return "none"
    low, high = beside(ends, abs(ends[1] - ends[0]) / 4)
    return f"{low} to {high}"


def _optimism(boot: Bootstrap, width: int) -> tuple[str, ...]:
    """What is left of R² on rows that did not choose the model."""
    lines: tuple[str, ...] = ()
    r_squared = boot.r_squared
    if r_squared.corrected is not None and r_squared.apparent is not None:
        lines += wrapped(
            f"R² is {figure(r_squared.apparent)} on its own rows and {number_text(r_squared.corrected)} "
            "once its optimism is taken off.",
            width,
        )
    if boot.calibration_slope is not None:
        lines += wrapped(
            f"Calibration slope {number_text(boot.calibration_slope)}: below 1, predictions are too far "
            "from the mean.",
            width,
        )
    return lines


def _ruling(one: RulingShare) -> str:
    return f"{one.ruling} on {one.subject} ({percent_text(one.same)})"


def hold_out_section(made: HoldOutFigures, width: int) -> Section:
    """Errors of prediction beside those of the mean."""
    how = (
        f"each of {count(len(made.groups), 'group')} left out once"
        if made.groups
        else f"{made.folds:,} parts, drawn {count(made.repeats, 'time')}"
    )
    if made.rmse is None:
        told = f"No row could be predicted ({how})."
    else:
        beside_mean = number_text(made.rmse_mean_model)
        told = f"Typical error {number_text(made.rmse)}, that of the mean {beside_mean} ({how})."
        if made.r_squared is not None:
            told += f" R² on unseen rows is {number_text(made.r_squared)}."
            if made.r_squared.value <= 0:
                told += " The plan predicts no better than the mean."
    lines = wrapped(told, width)
    if made.not_predicted or made.no_fit:
        told = (
            f"{count(made.not_predicted, 'prediction')} could not be made, and "
            f"{count(made.no_fit, 'part')} left no rows to run on."
        )
        lines += wrapped(told, width)
    return Section(title="On rows that it has not seen", lines=lines)

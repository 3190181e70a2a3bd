"""What a run and a trace quote of a rehearsal: a sentence or two beside the p-values."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import figure, listed
from beforehand.screen.shares import number_text, percent_text

if TYPE_CHECKING:
    from beforehand.rehearsing.figures import Estimate
    from beforehand.rehearsing.models import RehearsalRecord


def quoted(record: RehearsalRecord, *, selects: bool = True) -> tuple[str, ...]:
    """Sentences about the plan as a whole, the chance of a false find first.

    Parameters
    ----------
    record : RehearsalRecord
    selects : bool
        Whether the plan selects predictors.

    Returns
    -------
    tuple of str
        Empty where nothing was rehearsed that a run should quote.
    """
    made, said = record.scenarios, []
    if made.expected is not None and made.expected.any_without_effect_adopted is not None:
        said.append(
            "With the expected effects, this plan also adopts a predictor without an effect in "
            f"{_bracketed(made.expected.any_without_effect_adopted)}."
        )
    if made.noise is not None:
        start = "p-values after this selection: in" if selects else "In"
        said.append(f"{start} pure noise this plan adopts something in {_bracketed(made.noise.any_adopted)}.")
        real = made.noise.calibrated
        if real is not None and real.r_squared > 0:
            said.append(
                f"R² of {figure(real.r_squared)} or more comes up in pure noise in "
                f"{_bracketed(real.p_of_r_squared)}."
            )
    if made.resample is not None:
        r_squared = made.resample.bootstrap.r_squared
        if r_squared.corrected is not None and r_squared.apparent is not None:
            said.append(
                f"R² is {figure(r_squared.apparent)} on its own rows, {number_text(r_squared.corrected)} "
                "without its optimism."
            )
    return tuple(said)


def quoted_of(record: RehearsalRecord, subject: str) -> tuple[str, ...]:
    """What the rehearsal says of one predictor, in one sentence; nothing where it does not know it.

    Parameters
    ----------
    record : RehearsalRecord
    subject : str
        A predictor or product as it is named in the plan.
    """
    made, parts = record.scenarios, []
    if made.noise is not None and subject in made.noise.adopted:
        parts.append(f"in {_bracketed(made.noise.adopted[subject])} of pure noise")
    if made.expected is not None:
        if subject in made.expected.predictors:
            parts.append(
                f"in {_bracketed(made.expected.predictors[subject].adopted)} with its expected effect"
            )
        elif subject in made.expected.without_effect:
            parts.append(
                f"in {_bracketed(made.expected.without_effect[subject])} without an effect beside real ones"
            )
    if made.resample is not None and subject in made.resample.half_samples.inclusion:
        share = made.resample.half_samples.inclusion[subject]
        parts.append(f"on {percent_text(share, bracketed=True)} of half-samples")
    return (f"Rehearsed, this plan adopts {subject} {listed(parts)}.",) if parts else ()


def _bracketed(share: Estimate) -> str:
    """A share of tables with its error."""
    value, _, error = percent_text(share, bracketed=True).partition(" (")
    return f"{value} of tables ({error}" if error else f"{value} of tables"

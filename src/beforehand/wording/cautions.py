"""What is said beside every answer."""

from __future__ import annotations

from beforehand.steps.rulings import Ruling
from beforehand.wording.phrases import number
from beforehand.wording.sentences import sentence

# Rows per coefficient below which estimates are called unstable (common practice: 10 to 20).
FEW_ROWS_PER_COEFFICIENT = 10

ALWAYS = (
    "Association is not causation.",
    "The equation holds inside the range of the data it comes from.",
    "Decisions on people's health, safety, credit, work or housing need qualified review and local rules.",
)


def cautions(
    *,
    status: str,
    cap_reached: bool,
    exact: bool,
    unmended: tuple[str, ...],
    failed: list[Ruling],
    selected: bool,
    filled: bool,
    rows_per_coefficient: float,
    alternatives: int,
) -> tuple[str, ...]:
    """What must be said beside an answer: what this run calls for first, then what always holds."""
    said: list[str] = []
    if cap_reached:
        said.append(
            "More rows change the answer than the plan allows to remove: the answer hangs on single rows."
        )
    if exact:
        said.append("The model fits without residuals: see whether the outcome is computed from a predictor.")
    said += [f"{name} still bends: no rung of the ladder mends it." for name in unmended]
    said += [sentence(ruling) for ruling in failed]
    if rows_per_coefficient < FEW_ROWS_PER_COEFFICIENT:
        said.append(
            f"There are {number(rows_per_coefficient)} rows for each coefficient; below "
            f"{FEW_ROWS_PER_COEFFICIENT} coefficients are unstable (common practice)."
        )
    if filled:
        said.append("Filled cells count as observed, so standard errors are somewhat too small.")
    if selected and status == "adopted":
        said.append("The p-values come after a selection and are optimistic; so is R².")
    if alternatives:
        said.append("Read the declared alternatives beside this answer.")
    return (*said, *ALWAYS)

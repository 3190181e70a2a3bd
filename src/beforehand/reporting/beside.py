"""The records that stand beside a lock: its rehearsal and its refresh; and the methods behind it all."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from beforehand.rehearsing.models import ExpectedFigures, NoiseFigures, ResampleFigures
from beforehand.reporting import words
from beforehand.reporting.context import Context
from beforehand.reporting.details import columns_of
from beforehand.reporting.document import Block, Grid, Listing, Picture, Said, Section, paragraph, section
from beforehand.screen.digits import count, figure
from beforehand.screen.shares import number_text, percent_text

MOST_MODELS = 5


def rehearsal_section(context: Context) -> Section | None:
    """Figures of the rehearsal, the chance of a false find first."""
    made = context.rehearsal
    if made is None:
        return None
    on = "drawn predictors" if made.data is None else f"{count(made.data.rows, 'row')} of {made.data.file}"
    blocks: list[Block | None] = [
        paragraph(
            Said(
                f"The plan was tried on {made.replicates:,} tables of each world, made from {on} with seed "
                f"{made.seed}; ± is the Monte Carlo standard error."
            )
        )
    ]
    worlds = made.scenarios
    if worlds.expected is not None:
        blocks += _expected(worlds.expected)
    if worlds.noise is not None:
        blocks += _noise(worlds.noise)
    if worlds.resample is not None:
        blocks += _resample(worlds.resample)
    if worlds.hold_out is not None and worlds.hold_out.rmse is not None:
        held = worlds.hold_out
        blocks.append(
            paragraph(
                Said(
                    f"On rows that the plan had not seen the typical error was {number_text(held.rmse)}, "
                    f"that of the mean {number_text(held.rmse_mean_model)}, and R² "
                    f"{number_text(held.r_squared)}."
                )
            )
        )
    blocks.append(Listing(tuple(Said(text) for text in made.not_rehearsed)))
    return section("rehearsal", words.TITLES["rehearsal"], blocks)


def _expected(made: ExpectedFigures) -> list[Block | None]:
    """Where the expected effects are real."""
    rows = [
        (name, "" if one.true is None else figure(one.true), percent_text(one.power),
         number_text(one.exaggeration), percent_text(one.wrong_sign), percent_text(one.coverage))
        for name, one in made.predictors.items()
    ]  # fmt: skip
    heads = ("Effect", "True", "Found", "Too large, times", "Wrong sign", "Interval holds it")
    said = None
    if made.any_without_effect_adopted is not None:
        said = paragraph(
            Said(
                "With the expected effects, at least one predictor without an effect was adopted in "
                f"{percent_text(made.any_without_effect_adopted)} of tables."
            )
        )
    return [
        said,
        Grid(caption="The expected effects", columns=columns_of(heads, rows, left=1)) if rows else None,
    ]


def _noise(made: NoiseFigures) -> list[Block | None]:
    """Where nothing has an effect."""
    rows = [(name, percent_text(one)) for name, one in made.adopted.items()]
    said = f"In pure noise something was adopted in {percent_text(made.any_adopted)} of tables."
    real = made.calibrated
    if real is not None and real.r_squared > 0:
        said += (
            f" Noise reached the real answer's R² of {figure(real.r_squared)} in "
            f"{percent_text(real.p_of_r_squared)} of them."
        )
    table = Grid(
        caption="Adopted in pure noise", columns=columns_of(("Predictor", "Share of tables"), rows, left=1)
    )
    return [paragraph(Said(said)), table if rows else None]


def _resample(made: ResampleFigures) -> list[Block | None]:
    """On other samples from the same rows."""
    half = made.half_samples
    rows = [
        (", ".join(one.predictors) or "no predictor", percent_text(one.share))
        for one in half.models[:MOST_MODELS]
    ]
    shaky = sorted(made.bootstrap.rulings, key=lambda one: one.same.value)[:8]
    rulings = [
        (one.ruling, one.subject, one.ground.replace("_", " "), percent_text(one.same)) for one in shaky
    ]
    return [
        Picture("inclusion"),
        Picture("models"),
        Grid(
            caption="The most frequent answers on halves of the rows; "
            f"{count(half.different_models, 'answer')} in all",
            columns=columns_of(("Predictors", "Share of halves"), rows, left=1),
        ),
        Grid(
            caption="Rulings that fell as they fell least often",
            columns=columns_of(("Ruling", "On", "Ground", "Fell the same way"), rulings, left=3),
        )
        if rulings
        else None,
    ]


def refresh_section(context: Context) -> Section | None:
    """What a refreshed table did to the answer."""
    found = context.refresh
    if found is None:
        return None
    reasons = [Said(str(one)) for one in found.get("reasons") or ()]
    flipped = [Said(_flipped(one)) for one in found.get("rulings_flipped") or () if isinstance(one, Mapping)]
    moved = [
        (str(one.get("term")), _number(one.get("old")), _number(one.get("new")),
         _number(one.get("shift_in_old_se")))
        for one in found.get("coefficients") or ()
        if isinstance(one, Mapping)
    ]  # fmt: skip
    return section(
        "refresh",
        words.TITLES["refresh"],
        [
            paragraph(Said(words.refreshed(str(found.get("verdict"))))),
            Listing(tuple(reasons)),
            Picture("moved"),
            Grid(
                caption="Coefficients before and now",
                columns=columns_of(("Term", "Before", "Now", "Shift in old standard errors"), moved, left=1),
            )
            if moved
            else None,
            Listing(tuple(flipped)),
        ],
    )


def _flipped(one: Mapping[str, Any]) -> str:
    """A ruling that fell otherwise."""
    old, new = one.get("old"), one.get("new")
    before = old.get("says") if isinstance(old, Mapping) else "no such ruling."
    now = new.get("says") if isinstance(new, Mapping) else "no such ruling."
    return f"{one.get('subject')}, before: {before} Now: {now}"


def _number(value: object) -> str:
    return figure(float(value)) if isinstance(value, int | float) else ""


REFERENCES: Mapping[str, str] = {
    "curvature": "Tukey, J. W. (1977), Exploratory Data Analysis, on the ladder of powers.",
    "breusch_pagan": "Breusch, T. S. and Pagan, A. R. (1979), Econometrica 47:1287-1294; Koenker, R. (1981), "
    "Journal of Econometrics 17:107-112.",
    "white": "White, H. (1980), Econometrica 48:817-838.",
    "reset": "Ramsey, J. B. (1969), Journal of the Royal Statistical Society B 31:350-371.",
    "jarque_bera": "Jarque, C. M. and Bera, A. K. (1987), International Statistical Review 55:163-172.",
    "shapiro_wilk": "Shapiro, S. S. and Wilk, M. B. (1965), Biometrika 52:591-611.",
    "durbin_watson": "Durbin, J. and Watson, G. S. (1950), Biometrika 37:409-428.",
    "breusch_godfrey": "Godfrey, L. G. (1978), Econometrica 46:1293-1301.",
    "collinearity": "Belsley, D. A., Kuh, E. and Welsch, R. E. (1980), Regression Diagnostics.",
    "influence": "Cook, R. D. (1977), Technometrics 19:15-18.",
    "hc3": "MacKinnon, J. G. and White, H. (1985), Journal of Econometrics 29:305-325.",
    "holm": "Holm, S. (1979), Scandinavian Journal of Statistics 6:65-70.",
    "benjamini_hochberg": "Benjamini, Y. and Hochberg, Y. (1995), Journal of the Royal Statistical Society B "
    "57:289-300.",
    "box_cox": "Box, G. E. P. and Cox, D. R. (1964), Journal of the Royal Statistical Society B 26:211-252.",
    "smearing": "Duan, N. (1983), Journal of the American Statistical Association 78:605-610.",
    "noise": "Freedman, D. and Lane, D. (1983), Journal of Business and Economic Statistics 1:292-298.",
    "expected": "Gelman, A. and Carlin, J. (2014), Perspectives on Psychological Science 9:641-651.",
    "resample": "Harrell, F. E., Lee, K. L. and Mark, D. B. (1996), Statistics in Medicine 15:361-387; "
    "Heinze, G., Wallisch, C. and Dunkler, D. (2018), Biometrical Journal 60:431-449.",
    "press": "Allen, D. M. (1974), Technometrics 16:125-127.",
    "unseen": "Cinelli, C. and Hazlett, C. (2020), Journal of the Royal Statistical Society B 82:39-67.",
    "near": "Cohen, J. (1988), Statistical Power Analysis for the Behavioral Sciences.",
}


def references_section(context: Context) -> Section | None:
    """The sources of the methods that this run used."""
    return section(
        "references",
        words.TITLES["references"],
        [Listing(tuple(Said(REFERENCES[name]) for name in _used(context)))],
    )


def _used(context: Context) -> list[str]:
    """Names of the methods that were used, in the order of the list above."""
    lock, written = context.lock, context.written
    steps = written.get("steps") or ()
    used = {check.check for check in lock.checks.assumptions}
    used |= {step for step in ("collinearity", "influence") if step in steps}
    used.add(str(written.get("multiplicity")))
    answer = lock.answer
    if answer is not None:
        used.add(answer.errors)
        if answer.predicted_r_squared is not None:
            used.add("press")
        if answer.outcome.smearing is not None:
            used.add("smearing")
        if answer.near_misses:
            used.add("near")
        if answer.predictors and lock.status == "adopted":
            used.add("unseen")
    if any(fate.transform == "box_cox" for fate in lock.predictors.values()):
        used.add("box_cox")
    if context.rehearsal is not None:
        made = context.rehearsal.scenarios
        used |= {name for name in ("noise", "expected", "resample") if getattr(made, name) is not None}
    return [name for name in REFERENCES if name in used]

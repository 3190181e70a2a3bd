"""A rehearsal on a screen, and what a run quotes of it."""

from __future__ import annotations

import numpy as np
import pytest

from beforehand.rehearsing.figures import Estimate
from beforehand.rehearsing.models import RehearsalRecord, Scenarios
from beforehand.rehearsing.summaries import expected_figures, hold_out_figures, noise_figures
from beforehand.screen.layout import cells
from beforehand.screen.quoted import quoted, quoted_of
from beforehand.screen.rehearsal import rehearsal_text
from beforehand.screen.shares import number_text, percent_text

PATH = "greenhouse.rehearsal.yaml"


def with_scenarios(record: RehearsalRecord, **made) -> RehearsalRecord:
    """The record with these scenarios only."""
    return record.model_copy(update={"scenarios": Scenarios(**made)})


def test_the_chance_of_a_false_find_stands_first(record: RehearsalRecord) -> None:
    """It is the first line of the first scenario that is told."""
    lines = rehearsal_text(record, PATH).split("\n")
    assert lines[:5] == [
        "Rehearsal: greenhouse.rehearsal.yaml",
        "  greenhouse.plan.yaml, 400 replicates of each world, seed 20261201, on 104 rows of greenhouse.csv.",
        "",
        "If the expected effects are real",
        "  At least one predictor without an effect is adopted in 20 % ± 2 of tables of 100 rows.",
    ]


def test_every_scenario_has_its_part(record: RehearsalRecord) -> None:
    """On about one screen."""
    text = rehearsal_text(record, PATH)
    for title in (
        "If the expected effects are real",
        "If nothing has an effect",
        "On other samples from the same rows",
        "On rows that it has not seen",
        "A dry run on a shuffled outcome",
        "Reading it",
    ):
        assert f"\n{title}\n" in text
    assert "Fewest rows of these that find it in 80 % of tables: sun 100, glass none of these." in text
    assert len(text.split("\n")) < 60


@pytest.mark.parametrize("width", [60, 80, 100, 140])
def test_no_line_passes_the_edge(record: RehearsalRecord, width: int) -> None:
    """Tables give way before lines do."""
    for line in rehearsal_text(record, PATH, width=width).split("\n"):
        assert cells(line) <= width


def test_few_replicates_are_said(record: RehearsalRecord) -> None:
    """How wide the error is."""
    few = record.model_copy(update={"replicates": 50})
    text = rehearsal_text(few, PATH)
    assert "50 replicates are few: a share near 5 % has a standard error of 3.1 %." in text
    assert "are few" not in rehearsal_text(record, PATH)


def test_what_was_not_rehearsed_is_said(record: RehearsalRecord) -> None:
    """One line a scenario, with its reason."""
    less = with_scenarios(record).model_copy(update={"not_rehearsed": ("expected: there is no expects.",)})
    assert "Not rehearsed\n  - expected: there is no expects.\n" in rehearsal_text(less, PATH)


def test_nothing_found_and_nothing_to_find_are_plain_sentences(
    record: RehearsalRecord, made, subjects
) -> None:
    """A plan whose every replicate stopped, one whose every predictor has an effect, and no prediction."""
    nothing = made(200, status=[3] * 200)
    everything = {"sun": 1.0, "wind": 1.0, "glass[old]": 1.0}
    held = record.scenarios.hold_out
    assert held is not None
    text = rehearsal_text(
        with_scenarios(
            record,
            noise=noise_figures(nothing, subjects, 0.05),
            expected=expected_figures([(50, nothing)], subjects, everything, 0.05),
            hold_out=held.model_copy(update={"rmse": None, "rmse_mean_model": None, "r_squared": None}),
        ),
        PATH,
    )
    assert "so there is nothing to find falsely" in text
    assert "Tables without an answer count as adopting nothing: stopped 100.0 % ± 0.5." in text
    assert "No row could be predicted" in text


def test_a_plan_that_predicts_no_better_than_the_mean_is_told_so(record: RehearsalRecord, held_out) -> None:
    """An R² on unseen rows of 0 or less."""
    from dataclasses import replace

    worse = hold_out_figures(replace(held_out, squared=np.full((2, 3), 200.0)))
    text = rehearsal_text(with_scenarios(record, hold_out=worse), PATH)
    assert "The plan predicts no better than the mean." in text


def test_a_name_cannot_steer_the_terminal(record: RehearsalRecord) -> None:
    """Control signs in a name are shown, not sent."""
    noise = record.scenarios.noise
    assert noise is not None
    bad = noise.model_copy(update={"adopted": {"a\x1b[31m": noise.any_adopted}, "held": ("b\x07",)})
    text = rehearsal_text(with_scenarios(record, noise=bad), "x\x1b.yaml")
    assert "\x1b" not in text
    assert "\x07" not in text


def test_shares_are_told_as_far_as_their_error_goes() -> None:
    """One digit of the error; a lone share has brackets."""
    assert percent_text(Estimate(value=0.61, mc_error=0.0109)) == "61 % ± 1"
    assert percent_text(Estimate(value=0.048, mc_error=0.0048)) == "4.8 % ± 0.5"
    assert percent_text(Estimate(value=0.61, mc_error=0.0109), bracketed=True) == "61 % (± 1 %)"
    assert percent_text(Estimate(value=0.25, mc_error=None)) == "25.0 %"
    assert percent_text(None) == "none"
    assert number_text(Estimate(value=1.3124, mc_error=0.041)) == "1.31 ± 0.04"
    assert number_text(Estimate(value=-0.0001, mc_error=0.02)) == "0.00 ± 0.02"
    assert number_text(Estimate(value=1234.5, mc_error=12.0)) == "1,234 ± 12"
    assert number_text(Estimate(value=2.0, mc_error=0.0)) == "2.00"
    # 0.0996 is told as 0.1, with one decimal and not two.
    assert number_text(Estimate(value=2.0, mc_error=0.0996)) == "2.0 ± 0.1"


def test_a_run_quotes_the_false_finds(record: RehearsalRecord) -> None:
    """Beside real effects first, then in noise, then what is left of R²."""
    assert quoted(record) == (
        "With the expected effects, this plan also adopts a predictor without an effect in 20 % of tables "
        "(± 2 %).",
        "p-values after this selection: in pure noise this plan adopts something in 98.0 % of tables "
        "(± 0.7 %).",
        "R² of 0.760 or more comes up in pure noise in 48 % of tables (± 2 %).",
        "R² is 0.760 on its own rows, 0.7296 ± 0.0005 without its optimism.",
    )
    assert quoted(with_scenarios(record)) == ()


def test_a_trace_quotes_what_is_known_of_its_subject(record: RehearsalRecord) -> None:
    """With its effect or without one; nothing of a stranger."""
    assert quoted_of(record, "sun") == (
        "Rehearsed, this plan adopts sun in 97.0 % of tables (± 0.9 %) of pure noise, in 96.5 % of tables "
        "(± 0.9 %) with its expected effect and on 96 % (± 1 %) of half-samples.",
    )
    assert "in 20 % of tables (± 2 %) without an effect beside real ones" in quoted_of(record, "wind")[0]
    assert quoted_of(record, "moonlight") == ()

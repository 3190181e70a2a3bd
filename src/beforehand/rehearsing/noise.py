"""The noise world: the outcome's rows shuffled, so that nothing goes with it any more."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.stage import Stage
from beforehand.rehearsing.trials import Trials
from beforehand.steps.designing import Designer

NAME = "noise"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NoiseWorld:
    """Outcomes of which rows are shuffled.

    Attributes
    ----------
    stage : Stage
    kept, shuffled : FloatArray, shape (n,)
        What predictors that a keep rule holds always explain of the outcome, and the rest, whose rows
        are shuffled (Freedman & Lane 1983, J. Business & Economic Statistics 1:292-298). Without such
        a predictor the first is 0 and the second the outcome.
    seed : int
    """

    stage: Stage
    kept: FloatArray
    shuffled: FloatArray
    seed: int

    @property
    def name(self) -> str:
        """``noise``."""
        return NAME

    def trials(self, first: int, last: int) -> Trials:
        """What the plan comes to in some replicates."""
        outcomes = np.empty((last - first, len(self.shuffled)))
        for place, replicate in enumerate(range(first, last)):
            outcomes[place] = generator(self.seed, NAME, replicate).permutation(self.shuffled)
        return self.stage.trials(outcomes + self.kept)


def noise_world(stage: Stage, seed: int) -> NoiseWorld:
    """The noise world of a plan on a table."""
    setting = stage.setting
    outcome = setting.source.raw(setting.plan.outcome.column)
    held = {name for name, held in zip(stage.subjects.names, stage.subjects.held, strict=True) if held}
    model = Designer(setting.plan, setting.source).model(setting.state)
    keys = [key for term in model.terms if term.name in held for key in term.keys]
    if not keys or not len(outcome):
        # Without an intercept the mean of the outcome is no noise: any predictor would pick it up.
        level = 0.0 if setting.plan.intercept or not len(outcome) else float(outcome.mean())
        return NoiseWorld(stage=stage, kept=np.zeros_like(outcome), shuffled=outcome - level, seed=seed)
    columns = [setting.source.read(key, 0, len(outcome)) for key in keys]
    if setting.plan.intercept:
        columns.append(np.ones_like(outcome))
    design = np.column_stack(columns)
    scale = np.sqrt(np.einsum("ij,ij->j", design, design))
    design /= np.where(scale > 0.0, scale, 1.0)
    # Fitted values are the same for any of the solutions where the columns depend on each other.
    solution = np.linalg.lstsq(design, outcome, rcond=None)[0]
    kept = design @ solution
    rest = outcome - kept
    level = 0.0 if setting.plan.intercept else float(rest.mean())
    return NoiseWorld(stage=stage, kept=kept, shuffled=rest - level, seed=seed)
